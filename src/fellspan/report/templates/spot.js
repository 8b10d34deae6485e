// One spot, marked on the profile and on the key plan at once: by pointing at either, or with the keyboard.
(function () {
  "use strict";
  var tool = fellspanWhatIf;
  if (!tool) return;
  var data = tool.data, need = fellspanNeed, spots = tool.spots, say = tool.say, length = data.length, count = spots.x.length;
  var readout = tool.figure.querySelector(".spot"), way = [], here = 0, shown = false, mark = null, tip = null;
  for (var i = 0; i < data.way.length; i += 2) way.push([data.way[i] / 1e7, data.way[i + 1] / 1e7]);

  function place(at) {
    var part = at / length * (way.length - 1), first = Math.min(Math.floor(part), way.length - 2), share = part - first;
    return [0, 1].map(function (axis) { return way[first][axis] + (way[first + 1][axis] - way[first][axis]) * share; });
  }
  function side(value, letters) { return Math.abs(value).toFixed(5) + " " + letters[value < 0 ? 1 : 0]; }
  function coordinates(spot) { return side(spot[0], "NS") + ", " + side(((spot[1] + 540) % 360 + 360) % 360 - 180, "EW"); }
  function nearest(at) {
    var low = 0, high = count - 1;
    while (low < high) {
      var middle = (low + high) >> 1;
      if (spots.x[middle] < at) low = middle + 1; else high = middle;
    }
    return low > 0 && at - spots.x[low - 1] < spots.x[low] - at ? low - 1 : low;
  }

  function told(index) {
    var now = tool.last(), at = spots.x[index], tree = spots.tree[index];
    var lift = tree < 0 ? 0 : need.growth(data, tool.points, tree, now.years, now.taller), ground = spots.ground[index];
    var surface = ground + (spots.cover[index] > 0 ? spots.cover[index] + lift : 0);
    var bulge = need.bulge(at, length, now.k), ray = need.ray(at, length, now.a, now.b);
    return {
      at: at, spot: place(at), ground: ground, surface: surface, bulge: bulge, available: ray,
      required: surface + bulge + now.fraction * need.radius(at, length, now.frequency)
    };
  }
  function words(item) {
    var parts = [
      coordinates(item.spot), say.distance(item.at) + " from A, " + say.distance(length - item.at) + " from B",
      "ground " + say.metres(item.ground)
    ];
    if (item.surface > item.ground + 0.05) parts.push("top of what stands there " + say.metres(item.surface));
    parts.push("level required " + say.metres(item.required), "available " + say.metres(item.available));
    return parts;
  }
  function show(index) {
    here = Math.min(Math.max(index, 0), count - 1);
    var item = told(here), parts = words(item);
    tool.sheets.forEach(function (sheet) {
      var sketch = sheet.sketch, cursor = sheet.cursor, ground = sketch.y(item.surface + item.bulge) / sketch.height * 100;
      cursor.style.left = sketch.x(item.at) / sketch.width * 100 + "%";
      cursor.style.top = sketch.top / sketch.height * 100 + "%";
      cursor.style.height = (sketch.bottom - sketch.top) / sketch.height * 100 + "%";
      cursor.style.setProperty("--spot", (ground - sketch.top / sketch.height * 100) / ((sketch.bottom - sketch.top) / sketch.height) + "%");
      cursor.setAttribute("aria-valuenow", Math.round(item.at));
      cursor.setAttribute("aria-valuetext", parts.slice(1).concat(parts[0]).join("; "));
      cursor.classList.toggle("is-shown", shown);
    });
    if (!shown) return;
    readout.replaceChildren();
    parts.forEach(function (part, order) {
      var made = document.createElement(order === 0 ? "b" : "span");
      made.textContent = part;
      readout.append(made, " ");
    });
    readout.classList.add("is-shown");
    onMap(item);
  }
  function onMap(item) {
    if (!mark) {
      mark = L.circleMarker(item.spot, {radius: 7, weight: 3, fill: true, className: "map-spot", interactive: false}).addTo(fellspanMap.map);
      tip = L.tooltip({direction: "top", offset: [0, -8], permanent: true, className: "map-spot-words"});
      mark.bindTooltip(tip);
    }
    mark.setLatLng(item.spot);
    // Numbers and letters of our own only: the map takes its words as markup.
    mark.setTooltipContent(coordinates(item.spot) + "<br>" + say.distance(item.at) + " from A");
  }
  function hide() {
    shown = false;
    if (mark) { mark.remove(); mark = null; }
    readout.replaceChildren(readout.dataset.hint);
    readout.classList.remove("is-shown");
    show(here);
  }
  function point(at) { shown = true; show(nearest(at)); }

  tool.sheets.forEach(function (sheet) {
    var cursor = document.createElement("div"), sketch = sheet.sketch;
    sheet.cursor = cursor;
    cursor.className = "spot-cursor";
    cursor.tabIndex = 0;
    cursor.setAttribute("role", "slider");
    cursor.setAttribute("aria-label", "Spot on the path, m from A");
    cursor.setAttribute("aria-valuemin", "0");
    cursor.setAttribute("aria-valuemax", String(Math.round(length)));
    cursor.addEventListener("keydown", function (event) {
      var step = event.shiftKey ? Math.round(count / 20) : 1, next = here;
      switch (event.key) {
        case "ArrowRight": case "ArrowUp": next += step; break;
        case "ArrowLeft": case "ArrowDown": next -= step; break;
        case "PageUp": next += Math.round(count / 10); break;
        case "PageDown": next -= Math.round(count / 10); break;
        case "Home": next = 0; break;
        case "End": next = count - 1; break;
        case "Escape": hide(); return;
        default: return;
      }
      event.preventDefault();
      shown = true;
      show(next);
    });
    cursor.addEventListener("focus", function () { if (cursor.matches(":focus-visible")) { shown = true; show(here); } });
    sheet.box.append(cursor);
    function follow(event) {
      if (event.target.closest(".height-handle")) return;
      var box = sketch.svg.getBoundingClientRect(), unit = sketch.width / box.width, px = (event.clientX - box.left) * unit;
      var py = (event.clientY - box.top) * unit;
      if (px < sketch.left - 6 || px > sketch.right + 6 || py < sketch.top - 40 || py > sketch.height) return;
      if (event.pointerType === "mouse" && event.buttons && event.type === "pointermove" && window.getSelection().type === "Range") return;
      point(sketch.away(px));
    }
    sheet.box.addEventListener("pointermove", follow);
    sheet.box.addEventListener("pointerdown", follow);
  });

  // The other way: pointing at the path on the key plan.
  var map = fellspanMap.map, line = L.polyline(way, {className: "map-hit", interactive: true, bubblingMouseEvents: true, weight: 22}).addTo(map);
  function along(event) {
    var at = event.layerPoint, best = {far: Infinity, at: 0};
    for (var i = 0; i + 1 < way.length; i += 1) {
      var from = map.latLngToLayerPoint(way[i]), to = map.latLngToLayerPoint(way[i + 1]), run = to.subtract(from);
      var square = run.x * run.x + run.y * run.y, share = square ? ((at.x - from.x) * run.x + (at.y - from.y) * run.y) / square : 0;
      share = Math.min(Math.max(share, 0), 1);
      var far = at.distanceTo(from.add(run.multiplyBy(share)));
      if (far < best.far) best = {far: far, at: (i + share) / (way.length - 1) * length};
    }
    point(best.at);
  }
  line.on("mousemove click", along);

  here = nearest(tool.last().result.worstAt);
  document.addEventListener("fellspan-what-if", function () { show(here); });
  show(here);
})();
