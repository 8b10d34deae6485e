// Draws a what-if over one path profile: the land under another bulge, ray, lens, masts, governing point and levels.
// Takes places and words that are worked out already; `fellspanNeed` has the arithmetic.
var fellspanSketch = function (svg, data, points) {
  "use strict";
  var need = fellspanNeed, NS = "http://www.w3.org/2000/svg", length = data.length;
  var left = Number(svg.dataset.left), right = Number(svg.dataset.right), axis = Number(svg.dataset.axis);
  var top = Number(svg.dataset.top), bottom = Number(svg.dataset.bottom), callout = Number(svg.dataset.callout);
  var planned = {low: Number(svg.dataset.lowM), high: Number(svg.dataset.highM)}, scale = planned;
  var font = Number(svg.getAttribute("font-size")), small = font * 0.92, line = font * 1.38;
  var wide = svg.viewBox.baseVal.width, roomy = svg.classList.contains("full");
  var trees = [], land = null, layers = null, drawnLand = "", kept = [];
  for (var i = 0; i < points.x.length; i += 1) if (points.tree[i]) trees.push(i);

  function x(at) { return left + at / length * (right - left); }
  function y(level) { return bottom - (level - scale.low) / (scale.high - scale.low) * (bottom - top); }
  function away(px) { return Math.min(Math.max((px - left) / (right - left), 0), 1) * length; }
  function f(value) { return Math.round(value * 10) / 10; }

  function add(parent, name, attributes, content) {
    var made = document.createElementNS(NS, name);
    Object.keys(attributes).forEach(function (key) { made.setAttribute(key, attributes[key]); });
    if (content !== undefined) made.textContent = content;
    parent.appendChild(made);
    return made;
  }
  function stroke(parent, kind, x1, y1, x2, y2) {
    return add(parent, "line", {class: kind, x1: f(x1), y1: f(y1), x2: f(x2), y2: f(y2)});
  }
  function write(parent, kind, px, py, content, anchor) {
    return add(parent, "text", {class: kind, x: f(px), y: f(py), "text-anchor": anchor || "start"}, content);
  }
  function trace(places, close) {
    return "M" + places.map(function (place) { return f(place[0]) + "," + f(place[1]); }).join("L") + (close ? "Z" : "");
  }

  // The rings of a path as they stand in the plan: place, level without the bulge, and whether growing trees lift it.
  function rings(path, k, lifts, groundY) {
    var tokens = path.getAttribute("d").match(/[a-z]|-?\d*\.?\d+/gi), at = [0, 0], ring = null, all = [], mode = "M", i = 0;
    function put(px, py) {
      var last = ring.places[ring.places.length - 1], parts = last ? Math.ceil(Math.abs(px - last.px) / 12) : 1;
      for (var part = 1; part <= Math.max(parts, 1); part += 1) {
        var share = parts ? part / Math.max(parts, 1) : 1;
        var qx = last ? last.px + (px - last.px) * share : px, qy = last ? last.py + (py - last.py) * share : py;
        var from = away(qx), loose = qy < bottom - 0.06;
        ring.places.push({
          px: qx, py: qy, at: from, level: loose ? planLevel(qy) - need.bulge(from, length, k) : null,
          tree: lifts && qy < groundY(qx) - 0.8 ? nearestTree(from) : -1
        });
      }
      at = [px, py];
    }
    while (i < tokens.length) {
      if (/[a-z]/i.test(tokens[i])) {
        mode = tokens[i];
        i += 1;
        if (/z/i.test(mode)) { ring.closed = true; at = [ring.places[0].px, ring.places[0].py]; }
        continue;
      }
      var relative = mode === mode.toLowerCase(), kind = mode.toLowerCase();
      var dx = relative ? at[0] : 0, dy = relative ? at[1] : 0, one = Number(tokens[i]);
      if (kind === "h" || kind === "v") { put(kind === "h" ? one + dx : at[0], kind === "v" ? one + dy : at[1]); i += 1; continue; }
      if (kind === "m") {
        ring = {places: [], closed: false};
        all.push(ring);
        mode = relative ? "l" : "L";
      }
      put(one + dx, Number(tokens[i + 1]) + dy);
      i += 2;
    }
    return all;
  }
  function planLevel(py) { return planned.low + (bottom - py) / (bottom - top) * (planned.high - planned.low); }
  function nearestTree(at) {
    var low = 0, high = trees.length - 1;
    if (high < 0) return -1;
    while (low < high) {
      var middle = (low + high) >> 1;
      if (points.x[trees[middle]] < at) low = middle + 1; else high = middle;
    }
    return low > 0 && at - points.x[trees[low - 1]] < points.x[trees[low]] - at ? trees[low - 1] : trees[low];
  }

  function readLand() {
    var k = data.criteria[data.drawn].k, line = svg.querySelector(".ground-line"), flat = rings(line, k, false)[0].places, here = 0;
    function groundY(px) {
      while (here > 0 && flat[here].px > px) here -= 1;
      while (here < flat.length - 2 && flat[here + 1].px < px) here += 1;
      var from = flat[here], to = flat[here + 1], run = to.px - from.px;
      return run > 0 ? from.py + (to.py - from.py) * Math.min(Math.max((px - from.px) / run, 0), 1) : Math.min(from.py, to.py);
    }
    land = Array.from(svg.querySelectorAll(".land path, .doubt, .doubt-edge")).map(function (path) {
      return {path: path, d: path.getAttribute("d"), rings: rings(path, k, path.classList.contains("cover-tree"), groundY)};
    });
    ["leader-thin:y2", "ordinate:y1"].forEach(function (pair) {
      var parts = pair.split(":");
      svg.querySelectorAll("." + parts[0]).forEach(function (item) {
        var from = away(Number(item.getAttribute("x1"))), py = Number(item.getAttribute(parts[1]));
        kept.push({item: item, key: parts[1], at: from, was: item.getAttribute(parts[1]), level: planLevel(py) - need.bulge(from, length, k)});
      });
    });
    kept.texts = Array.from(svg.querySelectorAll(".site-more, .station .band-text, .key-text, desc")).map(function (item) {
      return {item: item, was: item.textContent};
    });
  }
  function layer(after) {
    var made = document.createElementNS(NS, "g"), place = svg.querySelector(after);
    made.setAttribute("class", "what-if-layer");
    place.parentNode.insertBefore(made, place.nextSibling);
    return made;
  }
  function open() {
    if (!land) readLand();
    if (layers) return;
    layers = {axis: layer(".axis-y"), zone: layer(".cuts"), ends: layer(".end-b"), band: layer(".band"), top: layer(".governing")};
    var clip = svg.querySelector("clipPath");
    layers.zone.setAttribute("clip-path", "url(#" + clip.id + ")");
    svg.classList.add("is-what-if");
  }

  function fit(view) {
    var high = Math.max(view.a, view.b), low = Math.min(view.a, view.b), at, level;
    for (var i = 1; i < 64; i += 1) {
      at = length * i / 64;
      high = Math.max(high, need.ray(at, length, view.a, view.b) + need.radius(at, length, view.frequency));
    }
    view.spots.x.forEach(function (from, j) { low = Math.min(low, view.spots.ground[j] + need.bulge(from, length, view.k)); });
    for (i = 0; i < points.x.length; i += 1) {
      level = view.surface[i] + need.bulge(points.x[i], length, view.k);
      if (level > high) high = level;
    }
    if (view.dragging) return scale;
    if (high <= planned.high && low >= planned.low) return planned;
    var span = Math.max(high - low, 6);
    return {low: low - 0.12 * span, high: low + 1.05 * span};
  }
  function drawLand(view) {
    var state = [view.k, view.years, view.taller, scale.low, scale.high].join();
    if (state === drawnLand) return;
    drawnLand = state;
    land.forEach(function (item) {
      item.path.setAttribute("d", item.rings.map(function (ring) {
        return trace(ring.places.map(function (place) {
          if (place.level === null) return [place.px, place.py];
          var lift = place.tree < 0 ? 0 : need.growth(data, points, place.tree, view.years, view.taller);
          return [place.px, Math.min(y(place.level + lift + need.bulge(place.at, length, view.k)), bottom)];
        }), ring.closed);
      }).join(""));
    });
    kept.forEach(function (item) {
      item.item.setAttribute(item.key, f(y(item.level + need.bulge(item.at, length, view.k))));
    });
    svg.classList.toggle("is-grown", view.years !== data.growth.years || view.taller !== 0);
  }
  function drawAxis() {
    layers.axis.textContent = "";
    var raw = (scale.high - scale.low) / (bottom - top > 180 ? 6 : 4), power = Math.pow(10, Math.floor(Math.log10(raw)));
    var step = power * [1, 2, 5, 10].find(function (factor) { return power * factor >= raw * (1 - 1e-9); });
    for (var level = Math.ceil(scale.low / step) * step; level <= scale.high + 1e-9; level += step) {
      var py = y(level);
      if (py < top + 4) continue;
      stroke(layers.axis, "grid", axis, py, right, py);
      stroke(layers.axis, "tick-y", axis - 4, py, axis, py).dataset.levelM = level;
      write(layers.axis, "axis", axis - 7, py + small * 0.35, view0(level), "end");
    }
    stroke(layers.axis, "axis-line", axis, bottom, axis, top);
    write(layers.axis, "axis", 2, top - 4, roomy ? "m above sea level" : "m asl");
  }
  function view0(level) { return Math.round(level) === 0 ? "0" : String(Math.round(level)).replace("-", "−"); }

  function drawZone(view) {
    layers.zone.textContent = "";
    var upper = [], lower = [], required = [], middle = [], at, i;
    for (i = 0; i <= 96; i += 1) {
      at = 0.5 * length * (1 - Math.cos(Math.PI * i / 96));
      var px = x(at), ray = need.ray(at, length, view.a, view.b), zone = need.radius(at, length, view.frequency);
      upper.push([px, y(ray + zone)]);
      lower.unshift([px, y(ray - zone)]);
      middle.push([px, y(ray)]);
      required.unshift([px, y(ray - view.fraction * zone)]);
    }
    add(layers.zone, "path", {class: "zone-whole", d: trace(upper.concat(lower), true)});
    if (view.fraction > 0) add(layers.zone, "path", {class: "zone-required", d: trace(middle.concat(required), true)});
    stroke(layers.zone, "plan-line", left, y(view.plan.a), right, y(view.plan.b));
    stroke(layers.zone, "sight-line", left, y(view.a), right, y(view.b));
    var run = [], cut = false;
    function close() {
      if (run.length) {
        if (run[run.length - 1][0] - run[0][0] < 5) {
          run.unshift([run[0][0] - 2.5, run[0][1]]);
          run.push([run[run.length - 1][0] + 2.5, run[run.length - 1][1]]);
        }
        add(layers.zone, "path", {class: cut ? "cut-sight" : "cut-zone", d: trace(run)});
      }
      run = [];
      cut = false;
    }
    for (i = 0; i < points.x.length; i += 1) {
      if (view.result.lacks[i] <= 1e-6) { close(); continue; }
      at = points.x[i];
      var level = view.surface[i] + need.bulge(at, length, view.k);
      cut = cut || level > need.ray(at, length, view.a, view.b);
      if (!run.length || x(at) - run[run.length - 1][0] >= 2) run.push([x(at), y(level)]);
      else if (y(level) < run[run.length - 1][1]) run[run.length - 1][1] = y(level);
    }
    close();
  }

  function dimension(parent, px, low, high) {
    function arrow(py, down) { add(parent, "path", {class: "arrow", d: "M" + f(px) + "," + f(py) + "l-2.4," + (down ? -6 : 6) + "h4.8z"}); }
    if (low - high >= 16) { stroke(parent, "dim", px, low, px, high); arrow(low, true); arrow(high, false); return; }
    stroke(parent, "dim", px, low, px, low + 12);
    stroke(parent, "dim", px, high, px, high - 12);
    arrow(low, false);
    arrow(high, true);
  }
  function drawEnd(end, level, atB, words) {
    var side = atB ? 1 : -1, px = atB ? right : left, foot = y(end.ground), tip = y(level), roof = foot, stops = [];
    var group = add(layers.ends, "g", {class: atB ? "what-if-b" : "what-if-a"});
    if (end.roof) {
      roof = y(end.ground + end.roof);
      add(group, "rect", {class: "roof", x: f(Math.min(px + side * 13, px - side * 6)), y: f(roof), width: 19, height: f(Math.max(foot - roof, 1))});
      stops.push([foot, roof, "roof ", end.roof]);
    }
    stops.push([roof, tip, end.roof ? "mast " : "", level - end.ground - (end.roof || 0)]);
    stroke(group, "mast", px, roof, px, tip);
    add(group, "path", {class: "dish", d: "M" + f(px) + "," + f(tip - 5) + "Q" + f(px - side * 7) + "," + f(tip) + " " + f(px) + "," + f(tip + 5) + "Z"});
    var dimX = px + side * (roomy ? 20 : 13), texts = stops.map(function (stop) { return (stop[0] + stop[1]) / 2 + small * 0.35; });
    if (texts.length === 2 && texts[0] - texts[1] < small * 1.1) {
      var middle = (texts[0] + texts[1]) / 2;
      texts = [middle + small * 0.55, middle - small * 0.55];
    }
    stops.forEach(function (stop, i) {
      dimension(group, dimX, stop[0], stop[1]);
      stroke(group, "extension", px + side * 3, stop[1], dimX + side * 4, stop[1]);
      write(group, "dim-text", dimX + side * 6, texts[i], (roomy ? stop[2] : "") + words.metres(stop[3]), atB ? "start" : "end");
    });
    stroke(group, "extension", px + side * 3, foot, dimX + side * 4, foot);
  }
  function drawGoverning(view, words) {
    layers.top.textContent = "";
    var item = view.result, level = item.surface + item.bulge, wanted = item.available - item.required, px = x(item.worstAt);
    var here = y(level), edge = y(wanted), low = Math.max(here, edge), high = Math.min(here, edge), met = item.spare >= -1e-6 ? "met" : "short";
    var group = add(layers.top, "g", {class: "governing what-if-governing " + met}), under = callout + line * 2 - font * 0.1;
    var first = words.first(roomy), second = words.second(roomy ? 96 : 50);
    var half = Math.max(first.length * font * 0.62, second.length * small * 0.56) / 2;
    var middle = Math.min(Math.max(px, half + 4), wide - half - 4);
    group.dataset.atM = item.worstAt;
    group.dataset.levelM = level;
    group.dataset.spareM = item.spare;
    // Below the names of obstacles, whose halo parts it where they meet.
    stroke(layers.ends, "leader", px, under, px, Math.max(high - (low - high < 16 ? 14 : 2), under));
    dimension(group, px, low, high);
    stroke(group, "extension", px - 9, here, px + 9, here);
    stroke(group, "extension", px - 9, edge, px + 9, edge);
    add(group, "circle", {class: "governing-point", cx: f(px), cy: f(here), r: 4});
    write(group, "callout " + met, middle, callout + font, first, "middle");
    write(group, "callout-more", middle, callout + font + line, second, "middle");
    var stamp = words.stamp, broad = stamp.length * font * 0.6 + 20;
    group = add(layers.top, "g", {class: "stamp-what-if"});
    add(group, "rect", {x: f((left + right - broad) / 2), y: f(bottom - line * 1.5), width: f(broad), height: f(line * 1.25), rx: 2});
    write(group, "stamp-text", (left + right) / 2, bottom - line * 0.65, stamp, "middle");
  }
  function drawBand(view, words) {
    layers.band.textContent = "";
    var item = view.result, px = x(item.worstAt), gap = (roomy ? 58 : 52) * 0.75, room = px - left >= gap && right - px >= gap, rows = null;
    svg.querySelectorAll(".station").forEach(function (station) {
      var at = Number(station.dataset.atM), texts = station.querySelectorAll(".band-text"), tree = nearestTree(at);
      var rise = tree >= 0 && Math.abs(points.x[tree] - at) < length / 400 && Number(station.dataset.surfaceM) - words.parse(texts[1].textContent) > 0.06;
      var surface = Number(station.dataset.surfaceM) + (rise ? need.growth(data, points, tree, view.years, view.taller) : 0);
      texts[2].textContent = words.number(surface + need.bulge(at, length, view.k) + view.fraction * need.radius(at, length, view.frequency));
      texts[3].textContent = words.number(need.ray(at, length, view.a, view.b));
      station.classList.toggle("stands-back", room && at > 0 && at < length && Math.abs(x(at) - px) < gap);
      rows = rows || Array.from(texts).map(function (text) { return Number(text.getAttribute("y")); });
    });
    if (!room || !rows) return;
    stroke(layers.band, "ordinate here", px, y(words.groundHere + item.bulge), px, rows[0] - line);
    var available = Math.round(item.available * 10) / 10;
    [words.kilometres(item.worstAt), words.number(words.groundHere), words.number(available - words.spareShown), words.number(available)]
      .forEach(function (content, row) { write(layers.band, "band-text here", px, rows[row], content, "middle"); });
  }

  function render(view, words) {
    open();
    scale = fit(view);
    drawLand(view);
    drawAxis();
    drawZone(view);
    layers.ends.textContent = "";
    drawEnd(data.a, view.a, false, words);
    drawEnd(data.b, view.b, true, words);
    drawBand(view, words);
    drawGoverning(view, words);
    svg.querySelectorAll(".site-more").forEach(function (item, i) {
      var level = words.metres(i ? view.b : view.a);
      item.textContent = roomy ? "antenna " + level + " above sea level" : level + " asl";
    });
    kept.texts.forEach(function (text) {
      if (text.was.indexOf("required part (") === 0) text.item.textContent = "required part (" + words.percent(view.fraction) + ")";
      if (text.item.nodeName === "desc") text.item.textContent = words.stamp + ". " + words.sentence;
    });
  }
  function clear() {
    scale = planned;
    if (!layers) return;
    Object.keys(layers).forEach(function (key) { layers[key].remove(); });
    layers = null;
    drawnLand = "";
    land.forEach(function (item) { item.path.setAttribute("d", item.d); });
    kept.forEach(function (item) { item.item.setAttribute(item.key, item.was); });
    kept.texts.forEach(function (text) { text.item.textContent = text.was; });
    svg.querySelectorAll(".stands-back").forEach(function (item) { item.classList.remove("stands-back"); });
    svg.classList.remove("is-what-if", "is-grown");
  }

  return {
    prepare: function () { if (!land) readLand(); },
    svg: svg, render: render, clear: clear, x: x, y: y, away: away, left: left, right: right, top: top, bottom: bottom,
    width: wide, height: svg.viewBox.baseVal.height,
    metresPerUnit: function () { return (scale.high - scale.low) / (bottom - top); },
    exaggeration: function () { return (bottom - top) / (scale.high - scale.low) / ((right - left) / length); }
  };
};
