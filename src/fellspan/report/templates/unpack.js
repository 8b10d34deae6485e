// Runs a script that the page carries packed (raw deflate, RFC 1951, in base64): the map library is a third of a page without it.
function runPacked(packed, size) {
  "use strict";
  var source = atob(packed), at = 0, hold = 0, left = 0, out = new Uint8Array(size), end = 0;
  function bits(count) {
    while (left < count) { hold |= source.charCodeAt(at++) << left; left += 8; }
    var value = hold & ((1 << count) - 1);
    hold >>>= count;
    left -= count;
    return value;
  }
  // A code: how many symbols each length has, and the symbols in the order of their codes.
  function code(lengths) {
    var counts = new Uint16Array(16), next = new Uint16Array(16), symbols = [], length;
    lengths.forEach(function (one) { counts[one]++; });
    counts[0] = 0;
    for (length = 1; length < 15; length++) next[length + 1] = next[length] + counts[length];
    lengths.forEach(function (one, symbol) { if (one) symbols[next[one]++] = symbol; });
    return {counts: counts, symbols: symbols};
  }
  function symbol(of) {
    var value = 0, first = 0, index = 0;
    for (var length = 1; length < 16; length++) {
      value |= bits(1);
      var count = of.counts[length];
      if (value - count < first) return of.symbols[index + value - first];
      index += count;
      first = (first + count) << 1;
      value <<= 1;
    }
    throw new Error("the packed script is damaged");
  }
  function many(count, value) { return new Array(count).fill(value); }
  var order = [16, 17, 18, 0, 8, 7, 9, 6, 10, 5, 11, 4, 12, 3, 13, 2, 14, 1, 15];
  function steps(extra, first) {
    return extra.map(function (count) { var start = first; first += 1 << count; return [start, count]; });
  }
  var lengths = steps([0, 0, 0, 0, 0, 0, 0, 0, 1, 1, 1, 1, 2, 2, 2, 2, 3, 3, 3, 3, 4, 4, 4, 4, 5, 5, 5, 5], 3).concat([[258, 0]]);
  var distances = steps([0, 0, 0, 0, 1, 1, 2, 2, 3, 3, 4, 4, 5, 5, 6, 6, 7, 7, 8, 8, 9, 9, 10, 10, 11, 11, 12, 12, 13, 13], 1);
  var last, literals, backs;
  do {
    last = bits(1);
    var kind = bits(2);
    if (kind === 0) {
      hold = left = 0;
      var stored = source.charCodeAt(at) | source.charCodeAt(at + 1) << 8;
      for (at += 4; stored > 0; stored--) out[end++] = source.charCodeAt(at++);
      continue;
    }
    if (kind === 1) {
      literals = code(many(144, 8).concat(many(112, 9), many(24, 7), many(8, 8)));
      backs = code(many(30, 5));
    } else {
      var most = bits(5) + 257, far = bits(5) + 1, short = bits(4) + 4, sizes = many(19, 0), all = [], step;
      for (step = 0; step < short; step++) sizes[order[step]] = bits(3);
      var coded = code(sizes);
      while (all.length < most + far) {
        var one = symbol(coded);
        if (one < 16) all.push(one);
        else if (one === 16) all = all.concat(many(bits(2) + 3, all[all.length - 1]));
        else all = all.concat(many(one === 17 ? bits(3) + 3 : bits(7) + 11, 0));
      }
      literals = code(all.slice(0, most));
      backs = code(all.slice(most));
    }
    for (var found = symbol(literals); found !== 256; found = symbol(literals)) {
      if (found < 256) { out[end++] = found; continue; }
      var long = lengths[found - 257], length = long[0] + bits(long[1]);
      var back = distances[symbol(backs)], from = end - back[0] - bits(back[1]);
      while (length-- > 0) out[end++] = out[from++];
    }
  } while (!last);
  var script = document.createElement("script");
  script.textContent = new TextDecoder().decode(out);
  document.head.appendChild(script);
}
