// Sets a map up: view, names that do not overlap, online tiles only when the reader asks for them.
function setUpMap(map, options) {
  "use strict";
  var box = map.getContainer(), frame = box.parentElement, wanted = options.bounds, touched = false, tiles = null;
  var paper = window.matchMedia("print"), onPaper = false;
  map.attributionControl.setPrefix(false);
  map.attributionControl.addAttribution(options.credit);
  L.control.scale({imperial: false}).addTo(map);
  function fit(bounds) {
    wanted = bounds;
    touched = false;
    map.invalidateSize({animate: false});
    // First close to the frame, then as much further out as the names on its edges need.
    var room = {left: 22, top: 22, right: 22, bottom: 30};
    show(bounds, room);
    var wide = box.clientWidth, high = box.clientHeight, here = box.getBoundingClientRect();
    box.querySelectorAll(".site-name").forEach(function (name) {
      place(name, name.dataset.side);
      var at = name.getBoundingClientRect();
      room.left = Math.max(room.left, Math.min(22 + here.left - at.left + 6, wide * 0.28));
      room.right = Math.max(room.right, Math.min(22 + at.right - here.right + 6, wide * 0.28));
      room.top = Math.max(room.top, Math.min(22 + here.top - at.top + 6, high * 0.2));
      room.bottom = Math.max(room.bottom, Math.min(30 + at.bottom - here.bottom + 6, high * 0.2));
    });
    show(bounds, room);
  }
  function show(bounds, room) {
    map.fitBounds(bounds, {
      paddingTopLeft: [room.left, room.top], paddingBottomRight: [room.right, room.bottom], maxZoom: 17, animate: false
    });
  }
  function print(on) {
    // The sheet has another shape than the window: the map is fitted to it before it is drawn there, and back afterwards.
    on = on || paper.matches;
    if (on === onPaper) return;
    onPaper = on;
    document.documentElement.classList.toggle("printing", on);
    if (key && on) key.open = true;
    fit(on ? options.bounds : wanted);
    declutter();
  }
  function overlap(one, other) {
    return one.left < other.right + 2 && other.left < one.right + 2 && one.top < other.bottom && other.top < one.bottom;
  }
  var sides = ["n", "s", "ne", "nw", "se", "sw", "e", "w"];
  function place(name, side) {
    name.classList.remove.apply(name.classList, sides);
    name.classList.add(side);
  }
  function keepInside(name) {
    // A name that the frame would cut stands on another side of its site.
    var home = name.dataset.side, frame = box.getBoundingClientRect();
    var order = [home].concat(sides.filter(function (side) { return side !== home; }));
    var fits = order.find(function (side) {
      place(name, side);
      var here = name.getBoundingClientRect();
      return here.left >= frame.left + 2 && here.right <= frame.right - 2 && here.top >= frame.top && here.bottom <= frame.bottom;
    });
    if (!fits) place(name, home);
  }
  function declutter() {
    var names = Array.from(box.querySelectorAll(".site-name")), kept = [];
    names.forEach(keepInside);
    names.sort(function (a, b) {
      return Number(b.parentElement.classList.contains("is-chosen")) - Number(a.parentElement.classList.contains("is-chosen"));
    });
    names.forEach(function (name) {
      name.classList.remove("crowded");
      var here = name.getBoundingClientRect();
      if (kept.some(function (there) { return overlap(here, there); })) name.classList.add("crowded");
      else kept.push(here);
    });
  }
  var key = frame.querySelector("details.map-key");
  if (options.quiet) {
    map.scrollWheelZoom.disable();
    if (L.Browser.mobile) map.dragging.disable();
  }
  map.on("dragstart zoomstart", function () { touched = true; });
  map.on("zoomend moveend", declutter);
  new ResizeObserver(function () {
    if (touched && !onPaper) map.invalidateSize({animate: false}); else fit(wanted);
    declutter();
  }).observe(box);
  var button = frame.querySelector("[data-map=tiles]");
  if (button && options.tiles) button.addEventListener("click", function () {
    if (tiles) {
      tiles.remove();
      tiles = null;
      button.textContent = "Show online map tiles";
      return;
    }
    tiles = L.tileLayer(options.tiles.url, {attribution: options.tiles.credit, maxZoom: 19, opacity: 0.75}).addTo(map);
    button.textContent = "Hide online map tiles";
  });
  fit(wanted);
  declutter();
  window.addEventListener("beforeprint", function () { print(true); });
  window.addEventListener("afterprint", function () { print(false); });
  paper.addEventListener("change", function (event) { print(event.matches); });
  print(false);
  return {map: map, fit: fit, declutter: declutter, all: options.bounds};
}
