// Lays the picture of needed heights over the relief, and says for a place that is clicked what the picture shows there.
(function () {
  "use strict";
  var data = JSON.parse(document.getElementById("data").textContent);
  var map = L.map("map", {zoomAnimation: false, zoomSnap: 0.25, maxZoom: 18, minZoom: 2, attributionControl: true});
  var told = document.getElementById("told"), spot = null, pixels = null;
  map.attributionControl.setPrefix(false);
  map.attributionControl.addAttribution(escaped(data.credit));
  L.control.scale({imperial: false}).addTo(map);
  if (data.sea) document.body.classList.add("open-sea");
  if (data.relief) L.imageOverlay(data.relief, data.reliefBounds, {alt: "Shaded relief of the study's own terrain"}).addTo(map);
  L.imageOverlay(data.heights, data.bounds, {alt: "Mast height needed at each place", className: "heights"}).addTo(map);
  L.polyline(data.ring, {className: "map-ring", interactive: false}).addTo(map);
  L.polyline(data.rim, {className: "map-rim", interactive: false}).addTo(map);
  if (data.farthest) L.circleMarker(data.farthest, {radius: 8, className: "map-farthest", interactive: false}).addTo(map);
  var mark = document.createElement("div"), name = document.createElement("span"), dot = document.createElement("i");
  dot.className = "site-dot";
  name.className = "site-name n";
  name.textContent = data.site.name;
  mark.append(dot, name);
  mark.className = "site-mark";
  L.marker(data.site.at, {interactive: false, keyboard: false, icon: L.divIcon({html: mark, className: "", iconSize: [0, 0]})}).addTo(map);

  function escaped(text) {
    var span = document.createElement("span");
    span.textContent = text;
    return span.innerHTML;
  }
  function fit() {
    map.invalidateSize({animate: false});
    map.fitBounds(L.latLngBounds(data.rim), {padding: [14, 14], animate: false});
  }
  var picture = new Image();
  picture.onload = function () {
    var canvas = document.createElement("canvas");
    canvas.width = picture.width;
    canvas.height = picture.height;
    var pen = canvas.getContext("2d", {willReadFrequently: true});
    pen.drawImage(picture, 0, 0);
    pixels = {pen: pen, wide: picture.width, high: picture.height};
  };
  picture.src = data.heights;

  function northing(latitude) { return Math.log(Math.tan(Math.PI / 4 + latitude * Math.PI / 360)); }
  function classAt(at) {
    var low = northing(data.bounds[0][0]), high = northing(data.bounds[1][0]);
    var x = Math.floor((at.lng - data.bounds[0][1]) / (data.bounds[1][1] - data.bounds[0][1]) * pixels.wide);
    var y = Math.floor((high - northing(at.lat)) / (high - low) * pixels.high);
    if (x < 0 || y < 0 || x >= pixels.wide || y >= pixels.high) return null;
    var seen = pixels.pen.getImageData(x, y, 1, 1).data, best = null, least = 60;
    if (seen[3] === 0) return "none";
    data.classes.forEach(function (item) {
      var off = Math.abs(item.colour[0] - seen[0]) + Math.abs(item.colour[1] - seen[1]) + Math.abs(item.colour[2] - seen[2]);
      if (off < least) { least = off; best = item.label; }
    });
    return best === null || seen[3] > 210 ? "unknown" : best;
  }
  function radians(value) { return value * Math.PI / 180; }
  function bearing(from, to) {
    var turn = radians(to.lng - from[1]), a = radians(from[0]), b = radians(to.lat);
    var way = Math.atan2(Math.sin(turn) * Math.cos(b), Math.cos(a) * Math.sin(b) - Math.sin(a) * Math.cos(b) * Math.cos(turn));
    return (way * 180 / Math.PI + 360) % 360;
  }
  map.on("click", function (event) {
    if (!pixels) return;
    var at = event.latlng, away = map.distance(at, data.site.at), found = away <= data.radius_m ? classAt(at) : null;
    var words = found === null ? "Outside the circle." : found === "unknown" ? "No answer here: a gap in the terrain, or behind one."
      : found === "none" ? "Open water, or more than the highest mast asked about." : "Antenna needed here: " + found + " above ground, without the errors of the heights.";
    told.replaceChildren();
    told.appendChild(document.createElement("p")).textContent = words;
    told.appendChild(document.createElement("p")).textContent = (away / 1000).toFixed(1) + " km from the site, at about "
      + Math.round(bearing(data.site.at, at)) + "°; " + Math.abs(at.lat).toFixed(5) + (at.lat < 0 ? " S, " : " N, ")
      + Math.abs(at.lng).toFixed(5) + (at.lng < 0 ? " W" : " E");
    if (spot) spot.remove();
    spot = L.circleMarker(at, {radius: 7, className: "map-spot", interactive: false}).addTo(map);
  });
  fit();
  new ResizeObserver(fit).observe(document.getElementById("map"));
  function onPaper(is) {
    if (document.documentElement.classList.contains("printing") === is) return;
    document.documentElement.classList.toggle("printing", is);
    fit();
  }
  window.addEventListener("beforeprint", function () { onPaper(true); });
  window.addEventListener("afterprint", function () { onPaper(false); });
  window.matchMedia("print").addEventListener("change", function (event) { onPaper(event.matches); });
}());
