// Draws links and sites, and sets a map up: view, names that do not overlap, online tiles only when the reader asks for them.
function addLinks(map, links, choose) {
  "use strict";
  function drawn(kind, link, name, places) {
    var more = {className: name + " of-link-" + link.n, interactive: false, weight: 3, smoothFactor: 0.6};
    return L[kind](places, more).addTo(map);
  }
  // Kind after kind: the casing of one link never covers the line of another.
  links.forEach(function (link) { if (link.z) drawn("polygon", link, "map-zone", link.z); });
  links.forEach(function (link) { drawn("polyline", link, "map-casing", link.p); });
  links.forEach(function (link) { drawn("polyline", link, "map-path " + link.s, link.p); });
  links.forEach(function (link) {
    (link.c || []).forEach(function (cut) { drawn("polyline", link, "map-cut " + cut[0] + " " + link.s, cut.slice(1)); });
  });
  links.forEach(function (link) {
    L.circleMarker(link.g, {className: "map-governing of-link-" + link.n, radius: 4, weight: 2, interactive: false}).addTo(map);
  });
  map.fellspanHits = {};
  if (!choose) return;
  // What takes the pointer lies above all that is drawn, whatever is brought forward there.
  map.createPane("hits").style.zIndex = 450;
  links.forEach(function (link) {
    var more = {className: "map-hit of-link-" + link.n, smoothFactor: 0.6, pane: "hits"};
    map.fellspanHits[link.n] = L.polyline(link.p, more).addTo(map);
  });
}
function addSites(map, sites) {
  "use strict";
  map.fellspanSites = sites.map(function (site) {
    var holder = document.createElement("div"), dot = document.createElement("i"), name = document.createElement("bdi");
    dot.className = "site-dot";
    name.className = "site-name " + site[4];
    name.dataset.side = site[4];
    name.textContent = site[2];
    dot.title = name.title = site[3] || site[2];
    holder.appendChild(dot);
    holder.appendChild(name);
    L.marker(site.slice(0, 2), {keyboard: false, interactive: false, icon: L.divIcon({
      className: ["site-mark"].concat(site[5].map(function (n) { return "of-link-" + n; })).join(" "), iconSize: [0, 0], html: holder
    })}).addTo(map);
    return {at: L.latLng(site[0], site[1]), name: name, home: site[4], links: site[5]};
  });
}
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
    var wide = box.clientWidth, high = box.clientHeight;
    map.fellspanSites.forEach(function (site) {
      site.name.classList.remove("crowded");
      site.size = [site.name.offsetWidth, site.name.offsetHeight];
    });
    map.fellspanSites.forEach(function (site) {
      var at = boxAt(map.latLngToContainerPoint(site.at), site.home, site.size[0], site.size[1], false);
      room.left = Math.max(room.left, Math.min(22 - at.left + 6, wide * 0.28));
      room.right = Math.max(room.right, Math.min(22 + at.right - wide + 6, wide * 0.28));
      room.top = Math.max(room.top, Math.min(22 - at.top + 6, high * 0.2));
      room.bottom = Math.max(room.bottom, Math.min(30 + at.bottom - high + 6, high * 0.2));
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
  var order = ["e", "w", "ne", "nw", "se", "sw", "n", "s"];
  function place(name, side, far) {
    name.className = "site-name " + side + (far ? " far" : "");
  }
  function boxAt(spot, side, wide, high, far) {
    // Where the style sheet puts a name of this size; worked out, since measuring each try would lay the page out anew.
    var out = far ? 26 : 9, up = far ? 20 : 8, left, top;
    if (side === "e" || side === "w") {
      left = side === "e" ? spot.x + out : spot.x - out - wide;
      top = spot.y - high / 2;
    } else {
      left = side.length > 1 ? (side[1] === "e" ? spot.x + (far ? 12 : 0) : spot.x - wide - (far ? 12 : 0)) : spot.x - wide / 2;
      top = side[0] === "n" ? spot.y - (side.length > 1 ? up - 3 : up) - high : spot.y + (side.length > 1 ? up - 3 : up);
    }
    return {left: left, right: left + wide, top: top, bottom: top + high};
  }
  function apart(one, other, by) {
    return one.left >= other.right + by || other.left >= one.right + by || one.top >= other.bottom || other.top >= one.bottom;
  }
  function declutter() {
    // The chosen link's ends first, then the sites that carry most: each takes the first side that is free.
    var sites = map.fellspanSites, wide = box.clientWidth, high = box.clientHeight, here = box.getBoundingClientRect();
    // No name goes below the buttons or the key of lines.
    var kept = Array.from(frame.querySelectorAll(".map-tools, .map-key, .leaflet-control-zoom")).map(function (part) {
      var at = part.getBoundingClientRect();
      return {left: at.left - here.left, right: at.right - here.left, top: at.top - here.top, bottom: at.bottom - here.top};
    });
    var sizes = sites.map(function (site) {
      site.name.classList.remove("crowded");
      return site.size || [site.name.offsetWidth, site.name.offsetHeight];
    });
    var spots = sites.map(function (site) { return map.latLngToContainerPoint(site.at); });
    var dots = spots.map(function (spot) { return {left: spot.x - 5, right: spot.x + 5, top: spot.y - 5, bottom: spot.y + 5}; });
    var turn = sites.map(function (_, index) { return index; });
    function weight(index) {
      var mark = sites[index].name.closest(".site-mark");
      return (mark && mark.classList.contains("is-chosen") ? 1e6 : 0) + sites[index].links.length;
    }
    turn.sort(function (a, b) { return weight(b) - weight(a) || a - b; });
    turn.forEach(function (index) {
      var site = sites[index], size = site.size = sizes[index], home = site.home, found = null;
      var near = [home].concat(order.filter(function (side) { return side !== home; }));
      [false, true].some(function (far) {
        return near.some(function (side) {
          var there = boxAt(spots[index], side, size[0], size[1], far);
          if (there.left < 2 || there.right > wide - 2 || there.top < 0 || there.bottom > high) return false;
          if (!kept.every(function (other) { return apart(there, other, 2); })) return false;
          if (!dots.every(function (dot, which) { return which === index || apart(there, dot, 0); })) return false;
          found = [side, far, there];
          return true;
        });
      });
      if (found) {
        place(site.name, found[0], found[1]);
        kept.push(found[2]);
      } else {
        place(site.name, home, false);
        site.name.classList.add("crowded");
      }
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
