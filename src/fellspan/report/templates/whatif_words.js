// The words of a what-if, as the plan says them: rounded toward caution, what is missing up and what is spare down.
var fellspanWords = function (data, points) {
  "use strict";
  var length = data.length, FUZZ = 1e-6;

  function number(value, digits) {
    var text = value.toFixed(digits === undefined ? 1 : digits);
    if (Number(text) === 0) text = text.replace("-", "");
    return text.replace("-", "−");
  }
  function up(value) { return Math.ceil(value * 10 - FUZZ) / 10; }
  function down(value) { return Math.floor(value * 10 + FUZZ) / 10; }
  function metres(value) { return number(value) + " m"; }
  function percent(share) { return number(share * 100, 0) + " %"; }
  function free(share) { return percent(Math.floor(share * 100 + FUZZ) / 100); }
  function distance(at) { return at < 999.5 ? number(at, 0) + " m" : number(at / 1000, 2) + " km"; }
  function kilometres(at) { return number(at / 1000, length < 2000 ? 3 : length < 100000 ? 2 : 1); }
  function kFactor(k) { return k === null ? "infinite" : Math.abs(k - 4 / 3) < 5e-4 ? "4/3" : number(k, 2); }
  function plain(value) { return String(Number(value.toPrecision(6))); }
  function frequency(hertz) { return hertz >= 1e9 ? plain(hertz / 1e9) + " GHz" : plain(hertz / 1e6) + " MHz"; }
  function shorten(text, most) { return text.length <= most ? text : text.slice(0, Math.max(1, most - 1)).trimEnd() + "…"; }

  function cause(view, i, lack) {
    var label = data.labels[points.what[i]];
    if (label.kind !== "ground" && label.kind !== "sea") return label.name;
    var at = points.x[i], level = view.surface[i], bulge = fellspanNeed.bulge(at, length, view.k);
    var chord = fellspanNeed.ray(at, length, data.a.ground, data.b.ground);
    if (lack > 0 && lack <= bulge && level - chord <= bulge) return label.kind === "sea" ? "Earth bulge over the sea" : "Earth bulge";
    return label.kind === "sea" ? "sea" : data.ground + " at " + number(level, 0) + " m";
  }
  function twoPoints(item) { return item.shortfall > 0 && Math.abs(item.shortAt - item.worstAt) > 0.002 * length; }
  function spareShown(item) {
    if (item.met) return down(Math.max(item.spare, 0));
    if (!twoPoints(item)) return -up(item.shortfall);
    return item.spare >= 0 ? down(item.spare) : -up(-item.spare);
  }
  function spareWords(item) {
    var spare = spareShown(item);
    return spare >= 0 ? metres(spare) + " to spare" : metres(-spare) + " short of the required clearance";
  }
  function zoneWords(view) {
    var item = view.result;
    if (item.clearance < 0) return "it stands " + metres(up(-item.clearance)) + " above the sight line";
    if (view.fraction === 0) return "only the sight line must be free at this k";
    if (item.fraction > 1.5) return "more than the whole zone is free";
    return free(item.fraction) + " of the zone is free, " + percent(view.fraction) + " is required";
  }
  function ruleWords(view) { return "k " + kFactor(view.k) + ", " + percent(view.fraction) + " of the first Fresnel zone"; }

  function remedy(item) {
    var ways = [["at A", item.extra.a], ["at B", item.extra.b], ["at both", item.extra.both]].filter(function (way) { return way[1] <= 100; });
    if (!ways.length) return "No practical mast meets it.";
    var said = ways.map(function (way) { return "+" + metres(up(way[1])) + " " + way[0]; }), last = said.pop();
    return (said.length ? said.join(", ") + " or " : "") + last + " would meet it.";
  }
  function answer(view) {
    var item = view.result, rule = "the drawn criterion (" + ruleWords(view) + ")";
    var where = distance(item.worstAt) + " from A (" + cause(view, item.worst, item.required - item.clearance) + ")";
    if (item.met) return "Clear by " + rule + ", " + metres(spareShown(item)) + " to spare at " + where + ": " + zoneWords(view) + ".";
    var least = item.lacks[item.short], lacks = metres(up(item.shortfall)) + " is missing";
    var at = twoPoints(item)
      ? " at " + distance(item.shortAt) + " from A (" + cause(view, item.short, least) + "); at " + where + " " + zoneWords(view)
      : " at " + where + ": " + zoneWords(view);
    return "Not clear by " + rule + ": " + lacks + at + ". " + remedy(item);
  }

  function above(end, height) { return plain(height) + " m above " + end.above; }
  function changes(state, plan) {
    var said = [];
    if (state.a !== plan.a) said.push("A at " + above(data.a, state.a));
    if (state.b !== plan.b) said.push("B at " + above(data.b, state.b));
    if (state.k !== null) said.push("k " + kFactor(state.k) + " in the drawn criterion, looked at alone");
    if (state.frequency !== plan.frequency) said.push(frequency(state.frequency));
    if (state.years !== plan.years) said.push("trees grown by " + plain(state.years) + (state.years === 1 ? " year" : " years"));
    if (state.taller !== 0) said.push("trees " + plain(state.taller) + " m taller");
    return said;
  }
  // The same change in the keys of the study file, a line for each, with the table that it belongs to behind it.
  function toml(state, plan) {
    var lines = [], here = "  # [[link]] " + data.link, pair = data.pair, drawn = data.criteria[data.drawn];
    function quoted(text) { return '"' + text + '"'; }
    if (state.a !== plan.a) lines.push("height_a = " + quoted(above(data.a, state.a)) + here);
    if (state.b !== plan.b) lines.push("height_b = " + quoted(above(data.b, state.b)) + here);
    if (state.frequency !== plan.frequency) {
      lines.push((pair ? "# " : "") + "frequency = " + quoted(frequency(state.frequency)) +
        (pair ? "  in its [[radio]], with transmit_a and transmit_b on both sides of it" : here));
    }
    if (state.k !== null) {
      lines.push("rules = [{ name = \"tried\", k = " + plain(state.k) + ", fraction = " + plain(drawn.fraction) +
        " }]  # [criteria], instead of preset, for every link");
    }
    if (state.years !== plan.years) lines.push("growth_years = " + plain(state.years) + "  # [study], for every link");
    if (state.taller !== 0) lines.push("# trees " + plain(state.taller) + " m taller: no key of its own; state growth of the cover, and growth_years");
    return lines;
  }

  return {
    number: number, metres: metres, percent: percent, distance: distance, kilometres: kilometres, kFactor: kFactor,
    frequency: frequency, plain: plain, cause: cause, spareShown: spareShown, spareWords: spareWords, zoneWords: zoneWords,
    ruleWords: ruleWords, twoPoints: twoPoints, answer: answer, changes: changes, toml: toml, shorten: shorten, above: above,
    parse: function (text) { return Number(text.replace("−", "-")); }
  };
};
