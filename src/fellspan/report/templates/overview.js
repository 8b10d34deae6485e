// Chooses a link on the map or in the list and shows its path profile.
(function () {
  "use strict";
  var panel = document.getElementById("chosen"), frame = document.querySelector(".map-frame");
  var entries = Array.from(document.querySelectorAll(".entry")), current = null;
  function mark(index, on) {
    document.querySelectorAll(".of-link-" + index).forEach(function (part) { part.classList.toggle("is-chosen", on); });
    entries[index].setAttribute("aria-pressed", String(on));
  }
  function close() {
    if (current === null) return;
    mark(current, false);
    entries[current].focus();
    current = null;
    panel.hidden = true;
    panel.replaceChildren();
    frame.classList.remove("has-choice");
  }
  function choose(index, fromMap) {
    if (current !== null) mark(current, false);
    current = index;
    mark(index, true);
    panel.replaceChildren(document.getElementById("chosen-" + index).content.cloneNode(true));
    panel.hidden = false;
    panel.scrollTop = 0;
    panel.dataset.link = String(index);
    frame.classList.add("has-choice");
    // Over a low map the key of lines would cover what was chosen; on a phone it stands below the map.
    var key = frame.querySelector(".map-key");
    if (key && frame.clientHeight < 340 && !window.matchMedia("(max-width: 760px)").matches) key.open = false;
    panel.querySelector("[data-close]").addEventListener("click", close);
    document.querySelectorAll(".map-path.of-link-" + index + ", .map-cut.of-link-" + index + ", .map-governing.of-link-" + index).forEach(function (part) {
      part.parentNode.appendChild(part);
    });
    document.querySelectorAll(".map-hit").forEach(function (part) { part.parentNode.appendChild(part); });
    entries[index].scrollIntoView({block: "nearest"});
    if (!fromMap) fellspanMap.fit(boundsOf(index));
    fellspanMap.declutter();
    if (window.matchMedia("(max-width: 760px)").matches) panel.scrollIntoView({block: "start"});
  }
  function layers() {
    var found = {};
    fellspanMap.map.eachLayer(function (layer) {
      var name = layer.options && layer.options.className || "", match = /^map-hit of-link-(\d+)$/.exec(name);
      if (match) found[match[1]] = layer;
    });
    return found;
  }
  var hits = layers();
  function boundsOf(index) { return hits[index].getBounds(); }
  Object.keys(hits).forEach(function (index) {
    hits[index].on("click", function (event) {
      L.DomEvent.stopPropagation(event);
      choose(Number(index), true);
    });
  });
  entries.forEach(function (entry) {
    entry.addEventListener("click", function () { choose(Number(entry.dataset.link), false); });
  });
  document.addEventListener("keydown", function (event) { if (event.key === "Escape") close(); });
  document.querySelector("[data-map=all]").addEventListener("click", function () { fellspanMap.fit(fellspanMap.all); });
  var search = document.getElementById("search");
  if (search) search.addEventListener("input", function () {
    var words = search.value.toLocaleLowerCase();
    entries.forEach(function (entry) {
      entry.parentElement.hidden = entry.textContent.toLocaleLowerCase().indexOf(words) < 0;
    });
  });
  var asked = entries.findIndex(function (entry) { return "#" + entry.id === window.location.hash; });
  if (asked >= 0) choose(asked, false);
})();
