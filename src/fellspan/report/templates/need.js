// The arithmetic of need = surface + bulge(k) + fraction * F1 over the points that can govern, and what follows from it.
// Lengths in m, levels in m above sea level, frequency in Hz; knows nothing of the page.
var fellspanNeed = (function () {
  "use strict";
  var EARTH_RADIUS_M = 6371000, SPEED_OF_LIGHT_M_S = 299792458, TOLERANCE_M = 1e-6, TIE = 1e-9;
  var ISOLATED_BAND = 0.3, ISOLATED_SHARE = 0.1;

  function sums(steps, scale) {
    var total = 0, out = new Float64Array(steps.length);
    for (var i = 0; i < steps.length; i += 1) { total += steps[i]; out[i] = total / scale; }
    return out;
  }

  function spread(turns, count) {
    // Runs as "begins at, value" by turns, back to a value for each place.
    var out = new Int32Array(count);
    for (var i = 0; i < turns.length; i += 2) out.fill(turns[i + 1], turns[i], i + 2 < turns.length ? turns[i + 2] : count);
    return out;
  }

  function unpack(data) {
    var count = data.points.x.length, x = sums(data.points.x, 1000);
    x[count - 1] = data.length;
    return {
      x: x, s: sums(data.points.s, 10000), what: spread(data.points.what, count), rate: spread(data.points.rate, count),
      tree: spread(data.points.tree, count)
    };
  }

  // What the trees at a point have grown by since the plan, m: by years at their own rates, and by a height that all share.
  function growth(data, points, i, years, taller) {
    var more = years - data.growth.years, pair = data.rates[points.rate[i]];
    return more * (more > 0 ? pair[1] : pair[0]) + (points.tree[i] ? taller : 0);
  }

  function surface(data, points, years, taller) {
    if (years === data.growth.years && taller === 0) return points.s;
    return points.s.map(function (level, i) { return level + growth(data, points, i, years, taller); });
  }

  function bulge(at, length, k) { return k === null ? 0 : at * (length - at) / (2 * EARTH_RADIUS_M * k); }

  function radius(at, length, frequency) {
    return Math.sqrt(Math.max(0, SPEED_OF_LIGHT_M_S / frequency * at * (length - at) / length));
  }

  function ray(at, length, a, b) { return a + (b - a) * at / length; }

  function nearer(x, i, best, length) { return Math.abs(x[i] - length / 2) < Math.abs(x[best] - length / 2); }

  // One criterion at given antenna levels: the least share of the zone, the greatest shortfall, the height that would mend it.
  function check(x, s, ask) {
    var length = ask.length, count = x.length, i, worst = 0, short = 0, least = Infinity, most = -Infinity;
    var shares = new Float64Array(count), lacks = new Float64Array(count), extraA = 0, extraB = 0;
    for (i = 0; i < count; i += 1) {
      var zone = radius(x[i], length, ask.frequency);
      var free = ray(x[i], length, ask.a, ask.b) - s[i] - bulge(x[i], length, ask.k), lack = ask.fraction * zone - free;
      shares[i] = zone > 0 ? free / zone : Infinity;
      lacks[i] = lack;
      if (shares[i] < least) least = shares[i];
      if (lack > most) most = lack;
      if (lack > TOLERANCE_M) {
        extraA = Math.max(extraA, x[i] < length ? lack / (1 - x[i] / length) : Infinity);
        extraB = Math.max(extraB, x[i] > 0 ? lack / (x[i] / length) : Infinity);
      }
    }
    worst = short = -1;
    for (i = 0; i < count; i += 1) {
      if (shares[i] <= least + TIE && (worst < 0 || nearer(x, i, worst, length))) worst = i;
      if (lacks[i] >= most - TIE && (short < 0 || nearer(x, i, short, length))) short = i;
    }
    var at = x[worst], met = most <= TOLERANCE_M, here = ray(at, length, ask.a, ask.b), rise = bulge(at, length, ask.k);
    var clearance = here - s[worst] - rise, required = ask.fraction * radius(at, length, ask.frequency);
    return {
      fraction: least, worst: worst, worstAt: at, clearance: clearance, required: required, available: here, bulge: rise,
      surface: s[worst], spare: clearance - required, met: met, shortfall: met ? 0 : most, short: short, shortAt: x[short],
      extra: {a: extraA, b: extraB, both: met ? 0 : most}, lacks: lacks
    };
  }

  // Whether what comes nearest to the ray is extended along the path rather than one isolated obstruction.
  function extended(x, s, ask) {
    var length = ask.length, least = Infinity, i, first = -1, last = -1;
    var shares = x.map(function (at, j) {
      var zone = radius(at, length, ask.frequency);
      return zone > 0 ? (ray(at, length, ask.a, ask.b) - s[j] - bulge(at, length, ask.k)) / zone : Infinity;
    });
    for (i = 0; i < x.length; i += 1) if (shares[i] < least) least = shares[i];
    if (least === Infinity) return true;
    for (i = 0; i < x.length; i += 1) {
      if (shares[i] > least + ISOLATED_BAND) continue;
      if (last >= 0 && last !== i - 1) return true;
      if (first < 0) first = i;
      last = i;
    }
    return x[Math.min(last + 1, x.length - 1)] - x[Math.max(first - 1, 0)] >= ISOLATED_SHARE * length;
  }

  // The criterion that the drawing shows: the greatest shortfall, else the least spare height at a governing point.
  function governing(results) {
    var missed = results.some(function (item) { return !item.met; }), best = 0;
    results.forEach(function (item, row) {
      if (missed ? item.shortfall > results[best].shortfall : item.spare < results[best].spare) best = row;
    });
    return best;
  }

  // Everything for one setting: {a, b, frequency, k (null: each criterion its own), years, taller}.
  function answer(data, points, setting) {
    var s = surface(data, points, setting.years, setting.taller), length = data.length;
    function ask(k, fraction) {
      return {length: length, a: setting.a, b: setting.b, frequency: setting.frequency, k: k, fraction: fraction};
    }
    var criteria = data.criteria;
    if (setting.k !== null) {
      var drawn = data.criteria[data.drawn];
      criteria = [{name: drawn.name, k: setting.k === Infinity ? null : setting.k, fraction: setting.fraction, typed: true}];
    } else if (data.isolated && !extended(points.x, s, ask(data.worstK, 0))) {
      criteria = data.isolated;
    }
    var results = criteria.map(function (item) { return check(points.x, s, ask(item.k, item.fraction)); });
    var row = governing(results);
    return {surface: s, criteria: criteria, results: results, row: row, criterion: criteria[row], result: results[row]};
  }

  return {
    unpack: unpack, sums: sums, spread: spread, growth: growth, bulge: bulge, radius: radius, ray: ray, check: check,
    extended: extended, answer: answer
  };
})();
