// Opens the key plan to the full window and closes it again; shows wide sketches from their middle, where the far site is.
(function () {
  "use strict";
  var plan = document.getElementById("key-plan"), button = plan.querySelector("[data-map=open]"), map = fellspanMap.map;
  function toggle(open) {
    plan.classList.toggle("open", open);
    document.body.classList.toggle("map-open", open);
    button.textContent = open ? "Close map" : "Open map";
    button.setAttribute("aria-expanded", String(open));
    if (open) { map.scrollWheelZoom.enable(); map.dragging.enable(); }
    else { map.scrollWheelZoom.disable(); if (L.Browser.mobile) map.dragging.disable(); }
    fellspanMap.fit(fellspanMap.all);
    fellspanMap.declutter();
  }
  document.querySelectorAll(".horizons .roll").forEach(function (roll) { roll.scrollLeft = (roll.scrollWidth - roll.clientWidth) / 2; });
  button.addEventListener("click", function () { toggle(!plan.classList.contains("open")); });
  document.addEventListener("keydown", function (event) {
    if (event.key === "Escape" && plan.classList.contains("open")) { toggle(false); button.focus(); }
  });
})();
