// Chooses a link on the map, in the list or in the table, and shows its small path profile.
var fellspanOverview = (function () {
  "use strict";
  var panel = document.getElementById("chosen"), frame = document.querySelector(".map-frame");
  var entries = Array.from(document.querySelectorAll(".entry")), rows = Array.from(document.querySelectorAll(".sortable tbody tr"));
  var current = null, from = null, hits = fellspanMap.map.fellspanHits;
  function make(tag, name, text) {
    var part = document.createElement(tag);
    part.className = name;
    part.textContent = text;
    return part;
  }
  function mark(index, on) {
    document.querySelectorAll(".of-link-" + index).forEach(function (part) { part.classList.toggle("is-chosen", on); });
    entries[index].setAttribute("aria-pressed", String(on));
    rows[index].classList.toggle("is-chosen", on);
  }
  function close() {
    if (current === null) return;
    unmark();
    mark(current, false);
    (from || entries[current]).focus();
    current = null;
    panel.hidden = true;
    panel.replaceChildren();
    frame.classList.remove("has-choice");
  }
  function head(row) {
    var made = make("div", "chosen-head", ""), link = row.querySelector("a").cloneNode(true), name = make("h2", "", "");
    var shut = make("button", "close", "Close");
    name.appendChild(link.firstChild);
    link.replaceChildren("Open the page of this link");
    link.className = "page-link";
    shut.type = "button";
    shut.dataset.close = "";
    shut.setAttribute("aria-label", "Close the path profile");
    shut.addEventListener("click", close);
    made.append(name, entries[row.dataset.link].querySelector(".verdict").cloneNode(true), make("span", "basis", row.cells[2].textContent), link, shut);
    return made;
  }
  // Pointing at the small profile marks the place on the map.
  var spot = null, line = null;
  function unmark() {
    if (spot) spot.remove();
    if (line) line.remove();
    spot = line = null;
    var said = panel.querySelector(".strip-at");
    if (said) said.textContent = "";
  }
  function follow(index) {
    var plot = panel.querySelector(".strip-plot"), length = Number(rows[index].cells[4].dataset.v), places = hits[index].getLatLngs();
    plot.addEventListener("pointermove", function (event) {
      var at = plot.getBoundingClientRect(), share = Math.min(1, Math.max(0, (event.clientX - at.left) / at.width));
      // The points of a path stand at even steps.
      var step = share * (places.length - 1), first = Math.min(Math.floor(step), places.length - 2), on = step - first;
      var place = L.latLng(
        places[first].lat + on * (places[first + 1].lat - places[first].lat), places[first].lng + on * (places[first + 1].lng - places[first].lng)
      );
      if (!spot) {
        spot = L.circleMarker(place, {className: "map-spot", radius: 6, interactive: false}).addTo(fellspanMap.map);
        line = plot.appendChild(document.createElement("b"));
      }
      spot.setLatLng(place);
      line.style.left = share * 100 + "%";
      panel.querySelector(".strip-at").textContent = (share * length / 1000).toFixed(2) + " km from A";
    });
    plot.addEventListener("pointerleave", unmark);
  }
  function choose(index, by) {
    var narrow = window.matchMedia("(max-width: 760px)").matches;
    unmark();
    if (current !== null) mark(current, false);
    current = index;
    from = by === "map" ? null : by;
    mark(index, true);
    panel.replaceChildren(head(rows[index]), document.getElementById("chosen-" + index).content.cloneNode(true));
    panel.hidden = false;
    follow(index);
    panel.scrollTop = 0;
    panel.dataset.link = String(index);
    frame.classList.add("has-choice");
    // Over a low map the key of lines would cover what was chosen; on a phone it stands below the map.
    var key = frame.querySelector(".map-key");
    if (key && frame.clientHeight < 340 && !narrow) key.open = false;
    document.querySelectorAll(".map-path.of-link-" + index + ", .map-cut.of-link-" + index + ", .map-governing.of-link-" + index).forEach(function (part) {
      part.parentNode.appendChild(part);
    });
    if (!narrow) entries[index].scrollIntoView({block: "nearest"});
    if (by !== "map") fellspanMap.fit(hits[index].getBounds());
    fellspanMap.declutter();
    if (narrow) panel.scrollIntoView({block: "start"});
    else if (from && from.closest(".under")) frame.scrollIntoView({block: "start"});
  }
  Object.keys(hits).forEach(function (index) {
    hits[index].on("click", function (event) {
      L.DomEvent.stopPropagation(event);
      choose(Number(index), "map");
    });
  });
  entries.forEach(function (entry) {
    entry.addEventListener("click", function () { choose(Number(entry.dataset.link), entry); });
  });
  rows.forEach(function (row) {
    var name = row.querySelector("a").textContent, show = make("button", "show", "Map");
    show.type = "button";
    show.setAttribute("aria-label", "Show " + name + " on the map");
    row.cells[0].prepend(show);
    row.addEventListener("click", function (event) {
      if (!event.target.closest("a") && !String(window.getSelection())) choose(Number(row.dataset.link), show);
    });
  });
  document.addEventListener("keydown", function (event) { if (event.key === "Escape") close(); });
  document.querySelector("[data-map=all]").addEventListener("click", function () { fellspanMap.fit(fellspanMap.all); fellspanMap.declutter(); });
  var asked = entries.findIndex(function (entry) { return "#" + entry.dataset.anchor === window.location.hash; });
  if (asked >= 0) choose(asked, entries[asked]);
  return {entries: entries, rows: rows};
})();
