"use strict";

/* Ticks with exact decimals: round values in steps of 1, 2 or 5 times a power of ten, also where a window is so
   narrow that all its values share their first twenty digits. */
const ticks = (() => {
  const LONGEST = 7; // characters of a label that are shown in full
  const SUPERSCRIPTS = "⁰¹²³⁴⁵⁶⁷⁸⁹";
  const raised = (e) => [...String(Math.abs(e))].map((digit) => SUPERSCRIPTS[digit]).join("");
  const power = (e) => `10${e < 0 ? "⁻" : ""}${raised(e)}`;
  const times = (k, e) => exact.scale(exact.powerOfTen(e), k, 1n);
  const plain = (k, e) => exact.decimal(times(k, e), Math.max(0, -e));

  /** The smallest round step {m, e} = m * 10^e of at least the given size. */
  function roundStep(least) {
    const e = exact.magnitude(least);
    const m = [1n, 2n, 5n].find((each) => !exact.less(times(each, e), least));
    return m ? { m, e } : { m: 1n, e: e + 1 };
  }

  /** Multiples k of m * 10^e from low to high. */
  function multiples(low, high, { m, e }) {
    const step = times(m, e);
    const first = exact.ceilDiv(low.num * step.den, low.den * step.num);
    const last = exact.floorDiv(high.num * step.den, high.den * step.num);
    return Array.from({ length: Math.max(0, Number(last - first) + 1) }, (_, k) => (first + BigInt(k)) * m);
  }

  const minus = (text) => text.replace("-", "−");

  function withPi(text) {
    if (/^-?0(\.0+)?$/.test(text)) return "0";
    return `${text.replace(/^(-?)1(\.0+)?$/, "$1")}π`;
  }

  /** Labels of k * 10^e, and what they are to be added to where they would be long in full. */
  function labels(numbers, e, ofPi) {
    const full = numbers.map((k) => (ofPi ? withPi(plain(k, e)) : plain(k, e)));
    if (full.every((text) => text.length <= LONGEST)) return { texts: full.map(minus), offset: "" };
    const base = exact.floorDiv(numbers[0], 1000n) * 1000n;
    const shared = base ? `${minus(exact.text(times(base, e)))} + ` : "";
    const offset = `${shared}tick × ${power(e)}`;
    return { texts: numbers.map((k) => minus(String(k - base))), offset: ofPi ? `(${offset}) π` : offset };
  }

  function linear(axis, low, high, count) {
    const step = roundStep(exact.scale(exact.subtract(high, low), 1n, BigInt(count)));
    const numbers = multiples(low, high, step);
    const { texts, offset } = labels(numbers.length ? numbers : [0n], step.e, axis.ofPi);
    const finer = step.m === 2n ? { m: 5n, e: step.e - 1 } : { m: step.m === 1n ? 2n : 10n, e: step.e - 1 };
    const place = (e) => (k) => axis.pixelOf(axis.positionOf(times(k, e)));
    return {
      major: numbers.map((k, n) => ({ pixel: place(step.e)(k), text: texts[n] })),
      minor: multiples(low, high, finer).map(place(finer.e)),
      offset,
    };
  }

  function decades(axis, low, high, count, visible) {
    const first = exact.magnitude(low);
    const last = exact.magnitude(high);
    const every = Math.max(1, Math.ceil(visible / count));
    const labelled = every > 1 || 3 * visible > count ? [1] : [1, 2, 5];
    const major = [];
    const minor = [];
    for (let e = first; e <= last; e += 1) {
      for (let m = 1; m <= 9; m += 1) {
        const value = times(BigInt(m), e);
        if (exact.less(value, low) || exact.less(high, value)) continue;
        const pixel = axis.pixelOf(axis.positionOf(value));
        if (!labelled.includes(m) || e % every) {
          if (every === 1 || m === 1) minor.push(pixel);
        } else {
          const short = plain(BigInt(m), e);
          major.push({ pixel, text: short.length <= 6 ? short : m === 1 ? power(e) : `${m}×${power(e)}` });
        }
      }
    }
    return { major, minor, offset: "" };
  }

  /** Ticks of the visible part of an axis.

      Returns {major: [{pixel, text}], minor: [pixel], offset}: about `count` labelled ticks, pixels from the lower
      edge of the window, and the number that the labels are to be added to, or "". */
  function of(axis, count) {
    const [from, to] = axis.window();
    const [low, high] = [axis.valueAt(from), axis.valueAt(to)];
    if (axis.logarithm !== null) {
      const share = Number(((to - from) << 40n) / axis.full) / 2 ** 40;
      const visible = (share * Number(axis.logarithm >> (axis.precision - 40n))) / 2 ** 40 / Math.LN10;
      if (visible > 0.8) return decades(axis, low, high, count, visible);
    }
    return linear(axis, low, high, count);
  }

  return { of };
})();
