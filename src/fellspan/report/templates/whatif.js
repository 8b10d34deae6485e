// What-if on the drawing: heights dragged, typed or stepped, k, frequency and trees; the answer, the way back, the line to copy.
var fellspanWhatIf = (function () {
  "use strict";
  var store = document.getElementById("what-if-data"), panel = document.getElementById("what-if");
  if (!store || !panel) return null;
  var data = JSON.parse(store.textContent), need = fellspanNeed, points = need.unpack(data), say = fellspanWords(data, points);
  var STAMP = "What-if: not the plan";
  var plan = {a: data.a.height, b: data.b.height, k: null, frequency: data.frequency, years: data.growth.years, taller: 0};
  var state = Object.assign({}, plan), last = null, waiting = 0, dragging = false, speaking = 0;
  var boxes = {}, figure = panel.closest("figure"), spots = {
    x: need.sums(data.spots.x, 100), ground: need.sums(data.spots.ground, 100), cover: need.sums(data.spots.cover, 100),
    tree: need.spread(data.spots.tree, data.spots.x.length)
  };
  spots.x[spots.x.length - 1] = data.length;
  var sheets = Array.from(figure.querySelectorAll(".sheet")).map(function (box) {
    return {
      box: box, sketch: fellspanSketch(box.querySelector("svg"), data, points), handles: {}, narrow: box.classList.contains("only-narrow")
    };
  });
  panel.querySelectorAll("[data-box]").forEach(function (box) { boxes[box.dataset.box] = box; });
  var answerLine = panel.querySelector(".what-if-answer"), lines = panel.querySelector(".what-if-lines");
  var copy = panel.querySelector("[data-what-if=copy]"), reset = panel.querySelector("[data-what-if=reset]");
  var heard = panel.querySelector("[role=status]"), asPlanned = answerLine.textContent, noLines = lines.textContent;
  var cells = Array.from(figure.querySelectorAll("[data-what-if-cell]")).map(function (cell) {
    return {cell: cell, was: Array.from(cell.childNodes)};
  });

  var phone = window.matchMedia("(max-width: 760px)"), paper = window.matchMedia("print"), printing = false;
  function isNarrow() { return phone.matches && !paper.matches && !printing; }
  [phone, paper].forEach(function (media) { media.addEventListener("change", function () { update(); }); });
  window.addEventListener("beforeprint", function () { printing = true; update(); });
  window.addEventListener("afterprint", function () { printing = false; update(); });

  function changed() { return Object.keys(plan).some(function (key) { return state[key] !== plan[key]; }); }
  function level(end, height) { return data[end].base + height; }

  function view() {
    var drawn = data.criteria[data.drawn];
    var found = need.answer(data, points, {
      a: level("a", state.a), b: level("b", state.b), frequency: state.frequency, k: state.k, fraction: drawn.fraction,
      years: state.years, taller: state.taller
    });
    return {
      a: level("a", state.a), b: level("b", state.b), frequency: state.frequency, years: state.years, taller: state.taller,
      k: found.criterion.k, fraction: found.criterion.fraction, surface: found.surface, result: found.result, found: found,
      plan: {a: level("a", plan.a), b: level("b", plan.b)}, spots: spots, dragging: dragging
    };
  }
  function wordsOf(now) {
    var item = now.result, two = say.twoPoints(item), first = say.spareWords(item), near = nearestSpot(item.worstAt);
    var label = data.labels[points.what[item.worst]].kind;
    return Object.assign({}, say, {
      stamp: STAMP, sentence: say.answer(now), spareShown: say.spareShown(item),
      groundHere: label === "ground" || label === "sea" ? item.surface : spots.ground[near],
      first: function (roomy) {
        return !two ? first : roomy ? "Least share of the zone: " + first : first.replace("of the required clearance", "here");
      },
      second: function (most) {
        var where = say.distance(item.worstAt) + " from A: " + say.cause(now, item.worst, item.required - item.clearance);
        var more = where + "; " + say.zoneWords(now);
        return say.shorten(more.length <= most ? more : where, most);
      }
    });
  }
  function nearestSpot(at) {
    var best = 0;
    for (var i = 1; i < spots.x.length; i += 1) if (Math.abs(spots.x[i] - at) < Math.abs(spots.x[best] - at)) best = i;
    return best;
  }

  function update() {
    waiting = 0;
    var start = performance.now(), now = view(), is = changed(), words = is ? wordsOf(now) : null;
    sheets.forEach(function (sheet) {
      // The drawing that is not shown waits until it is: for a turned phone, or for paper, which takes the wide one.
      if (!is) sheet.sketch.clear(); else if (sheet.narrow === isNarrow()) sheet.sketch.render(now, words);
    });
    last = now;
    placeHandles(now);
    tell(now, is, words);
    document.dispatchEvent(new CustomEvent("fellspan-what-if", {detail: now}));
    api.milliseconds = performance.now() - start;
  }
  function ask(more) {
    Object.assign(state, more);
    if (!waiting) waiting = requestAnimationFrame(update);
  }

  function tell(now, is, words) {
    figure.classList.toggle("is-what-if", is);
    panel.classList.toggle("is-changed", is);
    reset.disabled = !is;
    answerLine.textContent = is ? "" : asPlanned;
    lines.textContent = "";
    copy.hidden = !is;
    if (!is) lines.textContent = noLines;
    else {
      var strong = document.createElement("strong");
      strong.textContent = STAMP;
      answerLine.append(strong, " " + say.changes(state, plan).join("; ") + ". " + words.sentence);
      say.toml(state, plan).forEach(function (line) {
        var code = document.createElement("code");
        code.textContent = line;
        lines.append(code);
      });
    }
    fill(now);
    var texts = is && {
      frequency: say.frequency(now.frequency), criterion: now.found.criterion.name + ": " + say.ruleWords(now),
      levels: "Earth bulge at k " + say.kFactor(now.k) + " added; the sight line is straight", scale: scaleWords()
    };
    cells.forEach(function (item) {
      var text = texts && texts[item.cell.dataset.whatIfCell];
      var tries = text && text !== item.was.map(function (node) { return node.textContent; }).join("");
      item.cell.classList.toggle("tried", Boolean(tries));
      if (tries) item.cell.replaceChildren(text); else item.cell.replaceChildren.apply(item.cell, item.was);
    });
    clearTimeout(speaking);
    speaking = setTimeout(function () { heard.textContent = answerLine.textContent; }, 700);
  }
  function scaleWords() {
    var shown = sheets.find(function (sheet) { return !sheet.narrow; }).sketch.exaggeration();
    return "heights drawn " + (shown >= 10 ? shown.toFixed(0) : shown.toFixed(1)) + " times too tall";
  }
  function fill(now) {
    var trees = boxes.trees, unit = boxes.unit.value;
    [["a", state.a], ["b", state.b], ["frequency", state.frequency / 1e9], ["trees", unit === "m" ? state.taller : state.years]].forEach(function (pair) {
      if (boxes[pair[0]] !== document.activeElement) { boxes[pair[0]].value = say.plain(pair[1]); mark(boxes[pair[0]], true); }
    });
    if (boxes.k !== document.activeElement) { boxes.k.value = say.kFactor(now.k); mark(boxes.k, true); }
    trees.disabled = !points.tree.some(Boolean);
  }
  // A box that is typed wrong says what is allowed in the place of its name.
  function mark(box, good, range) {
    var label = box.closest("label"), name = label.querySelector("span");
    if (good) box.removeAttribute("aria-invalid"); else box.setAttribute("aria-invalid", "true");
    label.classList.toggle("is-wrong", !good);
    if (!label.dataset.name) label.dataset.name = name.textContent;
    name.textContent = good ? label.dataset.name : range;
  }

  var UNITS = {ghz: 1, mhz: 1e-3, m: 1, ft: 0.3048, years: 1, year: 1};
  function typedNumber(text) {
    var unit = (text.match(/[a-z]+\s*$/i) || [""])[0].trim().toLowerCase(), rest = text.replace(/[a-z]+\s*$/i, "").replace(",", ".");
    var parts = rest.split("/").map(function (part) { return part.trim() === "" ? NaN : Number(part); });
    var value = parts.length === 1 ? parts[0] : parts.length === 2 ? parts[0] / parts[1] : NaN;
    return unit === "" ? value : value * (UNITS[unit] || NaN);
  }
  function take(name, low, high, into) {
    boxes[name].addEventListener("input", function () {
      var value = typedNumber(boxes[name].value), good = Number.isFinite(value) && value >= low - 1e-9 && value <= high + 1e-9;
      mark(boxes[name], good, say.plain(low) + " to " + say.plain(high));
      if (good) ask(into(value));
    });
    boxes[name].addEventListener("change", function () { if (last) requestAnimationFrame(function () { fill(last); }); });
  }
  function steady(value, planned) { return Math.abs(value - planned) < 1e-9 ? planned : value; }
  take("a", data.a.least, data.a.most, function (value) { return {a: steady(value, plan.a)}; });
  take("b", data.b.least, data.b.most, function (value) { return {b: steady(value, plan.b)}; });
  take("frequency", 0.03, 300, function (value) { return {frequency: Math.abs(value * 1e9 / plan.frequency - 1) < 1e-9 ? plan.frequency : value * 1e9}; });
  take("trees", 0, 60, function (value) { return boxes.unit.value === "m" ? {taller: value} : {years: steady(value, plan.years)}; });
  take("k", 0.2, 100, function (value) {
    var own = data.criteria[data.drawn].k;
    return {k: own !== null && Math.abs(value - own) < 5e-3 ? null : value};
  });
  boxes.k.addEventListener("input", function () { if (boxes.k.value.trim() === "") { mark(boxes.k, true); ask({k: null}); } });
  boxes.unit.addEventListener("change", function () { ask({years: plan.years, taller: 0}); });
  reset.addEventListener("click", function () { boxes.unit.value = data.growth.grows ? "years" : "m"; ask(plan); panel.focus({preventScroll: true}); });
  copy.addEventListener("click", function () {
    var text = say.toml(state, plan).join("\n");
    function mine() {
      var range = document.createRange(), chosen = window.getSelection();
      range.selectNodeContents(lines);
      chosen.removeAllRanges();
      chosen.addRange(range);
      document.execCommand("copy");
    }
    function done() { copy.textContent = "Copied"; setTimeout(function () { copy.textContent = "Copy"; }, 1500); }
    if (navigator.clipboard) navigator.clipboard.writeText(text).then(done, function () { mine(); done(); }); else { mine(); done(); }
  });

  function held(end, value) {
    return Math.round(Math.min(Math.max(value, data[end].least), data[end].most) * 10) / 10;
  }
  function makeHandle(sheet, end) {
    var handle = document.createElement("div"), from = null, letter = end.toUpperCase();
    handle.className = "height-handle of-" + end;
    handle.tabIndex = 0;
    handle.setAttribute("role", "slider");
    handle.setAttribute("aria-orientation", "vertical");
    handle.setAttribute("aria-label", "Antenna height at " + letter + ", m above " + data[end].above);
    handle.title = "Drag to try another height at " + letter;
    handle.addEventListener("pointerdown", function (event) {
      from = {y: event.clientY, height: state[end]};
      dragging = true;
      handle.setPointerCapture(event.pointerId);
      handle.focus({preventScroll: true});
      event.preventDefault();
    });
    handle.addEventListener("pointermove", function (event) {
      if (!from) return;
      var unit = sheet.sketch.width / sheet.sketch.svg.getBoundingClientRect().width;
      var more = {}, value = held(end, from.height + (from.y - event.clientY) * unit * sheet.sketch.metresPerUnit());
      more[end] = steady(value, plan[end]);
      ask(more);
    });
    function drop() { if (from) { from = null; dragging = false; ask({}); } }
    ["pointerup", "pointercancel", "lostpointercapture"].forEach(function (name) { handle.addEventListener(name, drop); });
    handle.addEventListener("keydown", function (event) {
      var step = event.shiftKey ? 1 : 0.1, value = state[end], more = {};
      switch (event.key) {
        case "ArrowUp": case "ArrowRight": value += step; break;
        case "ArrowDown": case "ArrowLeft": value -= step; break;
        case "PageUp": value += 5; break;
        case "PageDown": value -= 5; break;
        case "Home": value = data[end].least; break;
        case "End": value = data[end].most; break;
        case "Escape": value = plan[end]; break;
        default: return;
      }
      event.preventDefault();
      more[end] = event.key === "Escape" ? value : steady(held(end, value), plan[end]);
      ask(more);
    });
    sheet.box.append(handle);
    sheet.handles[end] = handle;
  }
  function placeHandles(now) {
    sheets.forEach(function (sheet) {
      ["a", "b"].forEach(function (end) {
        var handle = sheet.handles[end], sketch = sheet.sketch;
        handle.style.left = (end === "a" ? sketch.left : sketch.right) / sketch.width * 100 + "%";
        handle.style.top = Math.max(sketch.y(now[end]), 8) / sketch.height * 100 + "%";
        handle.setAttribute("aria-valuemin", say.plain(data[end].least));
        handle.setAttribute("aria-valuemax", say.plain(data[end].most));
        handle.setAttribute("aria-valuenow", say.plain(state[end]));
        handle.setAttribute("aria-valuetext", say.above(data[end], state[end]));
      });
    });
  }

  var api = {
    data: data, points: points, spots: spots, sheets: sheets, say: say, panel: panel, figure: figure, milliseconds: 0,
    set: function (more) { Object.assign(state, more); cancelAnimationFrame(waiting); update(); return last; },
    state: function () { return Object.assign({}, state); }, plan: plan,
    last: function () { return last; }, reset: function () { return api.set(plan); }
  };
  boxes.unit.value = data.growth.grows ? "years" : "m";
  Array.from(boxes.unit.options).forEach(function (option) { if (option.value === "years") option.disabled = !data.growth.grows; });
  sheets.forEach(function (sheet) { ["a", "b"].forEach(function (end) { makeHandle(sheet, end); }); });
  document.documentElement.classList.add("with-script");
  update();
  // Read the drawing before the first change asks for it, so that the first drag is as quick as the next.
  setTimeout(function () { sheets.forEach(function (sheet) { if (sheet.narrow === isNarrow()) sheet.sketch.prepare(); }); }, 60);
  return api;
})();
