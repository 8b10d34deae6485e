// What a search for a relay adds to the map: the area below all lines, a number on each hop; relays become diamonds in addSites.
function addRelays(map, found) {
  "use strict";
  if (found.area.length) L.polygon(found.area, {className: "relay-area", interactive: false, smoothFactor: 0.5}).addTo(map);
  found.hops.forEach(function (hop) {
    var label = document.createElement("i");
    label.textContent = String(hop[1]);
    label.title = "way of rank " + hop[1];
    L.marker(hop.slice(2), {keyboard: false, interactive: false, icon: L.divIcon({
      className: "hop-rank of-link-" + hop[0], iconSize: [0, 0], html: label
    })}).addTo(map);
  });
  map.fellspanRelays = found.places;
}
function markRelays(map) {
  "use strict";
  (map.fellspanRelays || []).forEach(function (place) {
    map.fellspanSites.forEach(function (site) {
      if (site.at.lat !== place[0] || site.at.lng !== place[1]) return;
      site.name.parentNode.querySelector(".site-dot").classList.add("relay");
      if (!/relay/i.test(site.name.textContent)) site.name.textContent += " (relay)";
    });
  });
}
