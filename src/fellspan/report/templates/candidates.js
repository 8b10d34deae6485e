// Draws places on one canvas over the map, whatever their number, and fills the list; asks nothing of any network.
(function () {
  "use strict";
  var data = JSON.parse(document.getElementById("data").textContent);
  var relief = JSON.parse(document.getElementById("relief").textContent);
  var places = data.places, hubs = data.hubs, styles = getComputedStyle(document.documentElement);
  function tone(name) { return styles.getPropertyValue(name).trim() || "#333"; }
  var ink, sheet, tones;
  function readTones() {
    ink = tone("--ink");
    sheet = tone("--sheet");
    tones = ["--teal", "--teal", "--ochre", "--plum", "--stone", "--stone"].map(tone);
  }
  readTones();
  var shownHub = -1, shownPlace = -1;

  // A state is told by its shape: disc, ring, triangle, cross, square, dot.
  function mark(pen, state, x, y, r) {
    pen.beginPath();
    pen.lineWidth = Math.max(1.6, r / 2.6);
    pen.strokeStyle = pen.fillStyle = tones[state];
    if (state === 0) { pen.arc(x, y, r, 0, 7); halo(pen); pen.fill(); return; }
    if (state === 1) { pen.arc(x, y, r - 0.8, 0, 7); halo(pen); pen.stroke(); return; }
    if (state === 2) {
      pen.moveTo(x, y - r * 1.1); pen.lineTo(x + r * 1.05, y + r * 0.8); pen.lineTo(x - r * 1.05, y + r * 0.8); pen.closePath();
      halo(pen); pen.fill(); return;
    }
    if (state === 3) {
      pen.moveTo(x - r, y - r); pen.lineTo(x + r, y + r); pen.moveTo(x + r, y - r); pen.lineTo(x - r, y + r);
      halo(pen); pen.stroke(); return;
    }
    if (state === 4) { pen.rect(x - r * 0.85, y - r * 0.85, r * 1.7, r * 1.7); halo(pen); pen.stroke(); return; }
    pen.arc(x, y, r * 0.45, 0, 7); halo(pen); pen.fill();
  }
  function halo(pen) {
    var width = pen.lineWidth, colour = pen.strokeStyle;
    pen.strokeStyle = sheet; pen.lineWidth = width + 2.4; pen.stroke();
    pen.strokeStyle = colour; pen.lineWidth = width;
  }
  function paintMark(canvas) {
    var ratio = window.devicePixelRatio || 1, pen = canvas.getContext("2d");
    canvas.width = canvas.height = Math.round(18 * ratio);
    pen.scale(ratio, ratio);
    mark(pen, Number(canvas.dataset.state), 9, 9, 5);
  }
  document.querySelectorAll("canvas.mark").forEach(paintMark);

  var map = L.map("map", {zoomAnimation: false, zoomSnap: 0.25, maxZoom: 19, minZoom: 2, attributionControl: true});
  map.attributionControl.setPrefix(false);
  map.attributionControl.addAttribution(escaped(relief.credit));
  L.control.scale({imperial: false}).addTo(map);
  if (relief.sea) document.body.classList.add("open-sea");
  if (relief.url) L.imageOverlay(relief.url, relief.bounds, {alt: "Shaded relief of the study's own terrain"}).addTo(map);
  function fit() {
    map.invalidateSize({animate: false});
    map.fitBounds(relief.fit, {padding: [28, 28], maxZoom: 16, animate: false});
  }
  function escaped(text) {
    var span = document.createElement("span");
    span.textContent = text;
    return span.innerHTML;
  }
  var canvas = L.DomUtil.create("canvas", "place-canvas", map.getPanes().overlayPane);
  function at(lat, lon) { return map.latLngToContainerPoint([lat, lon]); }
  function draw() {
    var size = map.getSize(), ratio = window.devicePixelRatio || 1, pen = canvas.getContext("2d");
    L.DomUtil.setPosition(canvas, map.containerPointToLayerPoint([0, 0]));
    canvas.width = Math.round(size.x * ratio); canvas.height = Math.round(size.y * ratio);
    canvas.style.width = size.x + "px"; canvas.style.height = size.y + "px";
    pen.scale(ratio, ratio);
    if (data.squares) { drawSquares(pen); if (shownPlace >= 0) { drawLines(pen); drawChosen(pen); } }
    else { drawLines(pen); drawPlaces(pen, size); }
    drawHubs(pen, size);
  }
  function carries(hub, index) { return places.hub[index] === hub && places.state[index] <= 2; }
  function drawLines(pen) {
    if (shownHub < 0 && shownPlace < 0) return;
    // A light casing under a dark core: seen on any relief.
    pen.lineCap = "round";
    strokeLines(pen, sheet, shownPlace >= 0 ? 7 : 4.5);
    strokeLines(pen, ink, shownPlace >= 0 ? 3 : 1.5);
  }
  function strokeLines(pen, colour, width) {
    pen.strokeStyle = colour; pen.lineWidth = width;
    places.hub.forEach(function (hub, index) {
      if (hub < 0 || (shownPlace >= 0 ? index !== shownPlace : !carries(shownHub, index))) return;
      var from = at(hubs.lat[hub], hubs.lon[hub]), to = at(places.lat[index], places.lon[index]);
      pen.beginPath(); pen.moveTo(from.x, from.y); pen.lineTo(to.x, to.y); pen.stroke();
    });
  }
  function drawChosen(pen) {
    var spot = at(places.lat[shownPlace], places.lon[shownPlace]);
    mark(pen, places.state[shownPlace], spot.x, spot.y, 8);
  }
  function drawPlaces(pen, size) {
    var count = places.lat.length, radius = count > 4000 ? 3 : count > 600 ? 4 : 5;
    for (var state = 5; state >= 0; state -= 1) {
      for (var index = 0; index < count; index += 1) {
        if (places.state[index] !== state) continue;
        var spot = at(places.lat[index], places.lon[index]);
        if (spot.x < -9 || spot.y < -9 || spot.x > size.x + 9 || spot.y > size.y + 9) continue;
        mark(pen, state, spot.x, spot.y, index === shownPlace ? radius + 3 : radius);
      }
    }
  }
  function drawSquares(pen) {
    var squares = data.squares;
    squares.counts.forEach(function (counts, index) {
      var low = at(squares.lat[index], squares.lon[index]);
      var high = at(squares.lat[index] + squares.high, squares.lon[index] + squares.wide);
      var wide = high.x - low.x, tall = low.y - high.y, most = counts.indexOf(Math.max.apply(null, counts));
      var sum = counts.reduce(function (a, b) { return a + b; }, 0);
      pen.strokeStyle = tones[most]; pen.lineWidth = 1; pen.strokeRect(low.x + 1, high.y + 1, wide - 2, tall - 2);
      mark(pen, most, low.x + wide / 2, high.y + tall / 2 - (tall > 24 ? 5 : 0), Math.max(2, Math.min(5, wide / 4)));
      if (tall > 24 && wide > 24) {
        pen.fillStyle = ink; pen.font = "10px sans-serif"; pen.textAlign = "center";
        pen.fillText(String(sum), low.x + wide / 2, low.y - 3);
      }
    });
  }
  function drawHubs(pen, size) {
    var kept = [];
    pen.font = "600 13px sans-serif"; pen.textBaseline = "middle"; pen.textAlign = "left";
    hubs.name.forEach(function (name, index) {
      var spot = at(hubs.lat[index], hubs.lon[index]);
      if (spot.x < 0 || spot.y < 0 || spot.x > size.x || spot.y > size.y) return;
      pen.fillStyle = ink; pen.strokeStyle = sheet; pen.lineWidth = 2;
      pen.beginPath();
      pen.moveTo(spot.x, spot.y - 9); pen.lineTo(spot.x + 9, spot.y); pen.lineTo(spot.x, spot.y + 9); pen.lineTo(spot.x - 9, spot.y);
      pen.closePath(); pen.fill(); pen.stroke();
      var width = pen.measureText(name).width, left = spot.x + 12 + width > size.x ? spot.x - 12 - width : spot.x + 12;
      var box = {l: left, r: left + width, t: spot.y - 9, b: spot.y + 9};
      if (index !== shownHub && kept.some(function (o) { return box.l < o.r && o.l < box.r && box.t < o.b && o.t < box.b; })) return;
      kept.push(box);
      pen.lineWidth = 4; pen.strokeText(name, left, spot.y); pen.fillText(name, left, spot.y);
    });
  }
  map.on("moveend zoomend resize viewreset", draw);
  map.on("click", function (event) {
    var best = -1, near = 18, hub = -1;
    function look(lat, lon) {
      var spot = at(lat, lon), far = Math.hypot(spot.x - event.containerPoint.x, spot.y - event.containerPoint.y);
      if (far >= near) return false;
      near = far;
      return true;
    }
    if (!data.squares) places.lat.forEach(function (lat, index) { if (look(lat, places.lon[index])) best = index; });
    hubs.lat.forEach(function (lat, index) { if (look(lat, hubs.lon[index])) { hub = index; best = -1; } });
    if (hub >= 0) chooseHub(hub); else if (best >= 0) choosePlace(best); else { shownHub = shownPlace = -1; draw(); }
  });

  var told = document.getElementById("told");
  function tell(heading, lines) {
    told.replaceChildren();
    var head = told.appendChild(document.createElement("h3"));
    head.appendChild(document.createElement("bdi")).textContent = heading;
    lines.forEach(function (line) { told.appendChild(document.createElement("p")).textContent = line; });
  }
  function number(value, digits) { return value === null ? "\u2013" : value.toFixed(digits).replace("-", "\u2212"); }
  function extraWords(value) {
    var words = {no: "none helps", unsure: "not sure enough", some: "> 0"};
    return value === null ? "\u2013" : words[value] || (value === 0 ? "0" : "+" + value.toFixed(1));
  }
  function heightLine(index) {
    var meets = places.extra[index], sure = places.sure[index], asked = data.confidence + " confidence";
    if (meets === null || sure === 0) return "";
    if (meets === "no") return "No height at the place alone is enough.";
    var first = meets === 0 ? "Every criterion is met on the heights in the data" : "At the place alone, +" + meets.toFixed(1) + " m meets every criterion";
    if (sure === "unsure") return first + "; no height there does with " + asked + ".";
    if (sure === "some") return first + ", but not with " + asked + "; fellspan heights works out what would.";
    return first + "; with " + asked + " it takes at least +" + sure.toFixed(1) + " m.";
  }
  // From a list far down: the map and the box come into view, and a button leads back; what is in view stays where it is.
  function show(back) {
    var frame = document.querySelector(".map-frame"), box = frame.getBoundingClientRect();
    var away = box.top < -8 || Math.min(box.bottom, box.top + 300) > window.innerHeight;
    if (away) {
      frame.scrollIntoView({block: "start"});
      var button = told.appendChild(document.createElement("button"));
      button.type = "button"; button.className = "tool"; button.textContent = "Back to the list";
      button.addEventListener("click", function () {
        back.scrollIntoView({block: "center"});
        (back.querySelector("button") || back).focus({preventScroll: true});
      });
    }
    var side = told.parentElement, inside = told.getBoundingClientRect(), around = side.getBoundingClientRect();
    if (inside.top < around.top || inside.bottom > around.bottom) side.scrollTop += inside.top - around.top;
  }
  function intoMap(index) {
    if (!map.getBounds().contains([places.lat[index], places.lon[index]])) {
      map.panTo([places.lat[index], places.lon[index]], {animate: false});
    }
  }
  function choosePlace(index) {
    shownPlace = index; shownHub = -1;
    var hub = places.hub[index], lines = [data.states[places.state[index]].label];
    if (hub >= 0) {
      var sector = places.sector[index] < 0 ? "" : data.sectors[places.sector[index]];
      lines.push("Best hub: " + hubs.name[hub] + (sector ? ", sector " + sector : "") + ", " + number(places.km[index], 2) + " km" +
        (places.bearing[index] === null ? "" : ", bearing " + number(places.bearing[index], 1) + "\u00b0 from the hub"));
      lines.push("Heights: " + hubs.high[hub] + " at the hub, " + places.high[index] + " here");
    }
    if (places.signal[index] >= 0) lines.push("Signal: " + data.signals[places.signal[index]] + ", margin " + number(places.margin[index], 1) + " dB");
    if (heightLine(index)) lines.push(heightLine(index));
    var others = places.others[index].map(function (one) { return hubs.name[one]; });
    var left = places.clear[index] - others.length - (places.state[index] <= 1 ? 1 : 0);
    if (others.length) lines.push("Clear from these hubs too: " + others.join(", ") + (left > 0 ? " and " + left + " more" : ""));
    tell(places.name[index], lines);
    draw();
  }
  function chooseHub(index) {
    shownHub = index; shownPlace = -1;
    var count = places.hub.filter(function (_, place) { return carries(index, place); }).length;
    tell(hubs.name[index], data.squares ? [] : ["The best hub for " + count + (count === 1 ? " place" : " places") + ", joined by lines."]);
    draw();
  }
  document.querySelectorAll("[data-hub]").forEach(function (button) {
    var index = hubs.name.indexOf(button.dataset.hub);
    button.addEventListener("click", function () { if (index >= 0) { chooseHub(index); show(button.closest("tr")); } });
  });
  document.getElementById("all").addEventListener("click", fit);

  var body = document.querySelector("#place-list tbody"), find = document.getElementById("find"), only = document.getElementById("only");
  var more = document.getElementById("more"), by = "name", falling = false, PART = 200, visible = PART;
  var order = Array.from({length: data.listed}, function (_, index) { return index; });
  function keyOf(index) {
    if (by === "name") return places.name[index].toLocaleLowerCase();
    if (by === "hub") return places.hub[index] < 0 ? null : hubs.name[places.hub[index]].toLocaleLowerCase();
    var value = places[by][index];
    return value === "no" ? Infinity : value === "unsure" ? Number.MAX_VALUE : value === "some" ? 0.01 : by === "signal" && value < 0 ? null : value;
  }
  function sorted() {
    order.sort(function (a, b) {
      var one = keyOf(a), other = keyOf(b);
      if (one === other) return a - b;
      if (one === null) return 1;
      if (other === null) return -1;
      return (one < other ? -1 : 1) * (falling ? -1 : 1);
    });
    document.querySelectorAll("#place-list th[data-by]").forEach(function (head) {
      head.setAttribute("aria-sort", head.dataset.by === by ? (falling ? "descending" : "ascending") : "none");
    });
  }
  function fill() {
    var words = find.value.toLocaleLowerCase(), state = only.value, matching = order.filter(function (index) {
      return (!state || places.state[index] === Number(state)) && (!words || places.name[index].toLocaleLowerCase().indexOf(words) >= 0);
    });
    body.replaceChildren();
    matching.slice(0, visible).forEach(function (index) {
      var row = body.appendChild(document.createElement("tr")), head = row.appendChild(document.createElement("th"));
      head.scope = "row";
      var name = head.appendChild(document.createElement("button"));
      name.type = "button"; name.className = "as-link";
      name.appendChild(document.createElement("bdi")).textContent = places.name[index];
      var cell = row.appendChild(document.createElement("td")), icon = cell.appendChild(document.createElement("canvas"));
      icon.className = "mark"; icon.dataset.state = places.state[index]; icon.setAttribute("aria-hidden", "true");
      paintMark(icon);
      cell.appendChild(document.createTextNode(data.states[places.state[index]].label));
      [
        places.hub[index] < 0 ? "\u2013" : hubs.name[places.hub[index]], number(places.km[index], 2),
        places.signal[index] < 0 ? "\u2013" : data.signals[places.signal[index]], number(places.margin[index], 1),
        extraWords(places.sure[index]), String(places.clear[index])
      ].forEach(function (text, column) {
        var made = row.appendChild(document.createElement("td"));
        made.textContent = text;
        if (column !== 0 && column !== 2) made.className = "num";
      });
      if (index === shownPlace) row.className = "is-chosen";
      row.addEventListener("click", function () {
        body.querySelectorAll(".is-chosen").forEach(function (one) { one.className = ""; });
        row.className = "is-chosen";
        choosePlace(index); intoMap(index); show(row);
      });
    });
    hintAtMore();
    more.hidden = matching.length <= visible;
    more.textContent = "Show more (" + Math.max(0, matching.length - visible) + " left)";
  }
  document.querySelectorAll("#place-list th[data-by] button").forEach(function (button) {
    button.addEventListener("click", function () {
      var wanted = button.parentElement.dataset.by;
      falling = wanted === by ? !falling : false;
      by = wanted;
      visible = PART;
      sorted(); fill();
    });
  });
  [find, only].forEach(function (input) { input.addEventListener("input", function () { visible = PART; fill(); }); });
  more.addEventListener("click", function () { visible += PART; fill(); });
  // Colours differ by night and on paper: what is painted is painted again.
  function repaint() { readTones(); document.querySelectorAll("canvas.mark").forEach(paintMark); draw(); }
  ["(prefers-color-scheme: dark)", "print"].forEach(function (query) {
    window.matchMedia(query).addEventListener("change", repaint);
  });
  // A table wider than its box says that it goes on.
  function hintAtMore() {
    document.querySelectorAll(".scroll").forEach(function (box) {
      box.classList.toggle("goes-on", box.scrollWidth > box.clientWidth + 2);
      box.classList.toggle("is-cut", box.scrollWidth > box.clientWidth + box.scrollLeft + 2);
    });
  }
  document.querySelectorAll(".scroll").forEach(function (box) { box.addEventListener("scroll", hintAtMore, {passive: true}); });
  window.addEventListener("resize", hintAtMore);
  function onPaper(is) {
    if (document.documentElement.classList.contains("printing") === is) return;
    document.documentElement.classList.toggle("printing", is);
    fit(); repaint();
  }
  window.addEventListener("beforeprint", function () { onPaper(true); });
  window.addEventListener("afterprint", function () { onPaper(false); });
  window.matchMedia("print").addEventListener("change", function (event) { onPaper(event.matches); });
  new ResizeObserver(fit).observe(document.getElementById("map"));
  fit(); draw(); sorted(); fill();
  window.fellspanPage = {map: map, data: data, choosePlace: choosePlace, chooseHub: chooseHub};
})();
