// Sets a map up: view, names that do not overlap, online tiles only when the reader asks for them.
function setUpMap(map, options) {
  "use strict";
  var box = map.getContainer(), frame = box.parentElement, wanted = options.bounds, touched = false, tiles = null;
  map.attributionControl.setPrefix(false);
  map.attributionControl.addAttribution(options.credit);
  L.control.scale({imperial: false}).addTo(map);
  function fit(bounds) {
    wanted = bounds;
    touched = false;
    map.invalidateSize({animate: false});
    map.fitBounds(bounds, {padding: [Math.min(90, box.clientWidth * 0.16), 40], maxZoom: 17, animate: false});
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
  if (key && box.clientWidth < 600) key.open = false;
  if (options.quiet) {
    map.scrollWheelZoom.disable();
    if (L.Browser.mobile) map.dragging.disable();
  }
  map.on("dragstart zoomstart", function () { touched = true; });
  map.on("zoomend moveend", declutter);
  new ResizeObserver(function () {
    if (touched) map.invalidateSize({animate: false}); else fit(wanted);
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
  return {map: map, fit: fit, declutter: declutter, all: options.bounds};
}
