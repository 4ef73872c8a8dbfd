"use strict";

/* Exact numbers: rationals {num, den} of BigInt with den > 0, their decimals, and logarithms to as many bits
   as the caller asks for. Nothing here passes through a floating-point number. */
const exact = (() => {
  const rational = (num, den = 1n) => ({ num, den });
  const parse = (text) => rational(BigInt(text.num), BigInt(text.den));

  const floorDiv = (a, b) => a / b - (a % b < 0n ? 1n : 0n);
  const ceilDiv = (a, b) => -floorDiv(-a, b);
  const roundDiv = (a, b) => floorDiv(2n * a + b, 2n * b);

  const add = (a, b) => rational(a.num * b.den + b.num * a.den, a.den * b.den);
  const subtract = (a, b) => rational(a.num * b.den - b.num * a.den, a.den * b.den);
  const multiply = (a, b) => rational(a.num * b.num, a.den * b.den);
  const scale = (a, num, den) => rational(a.num * num, a.den * den);
  const less = (a, b) => a.num * b.den < b.num * a.den;
  const powerOfTen = (e) => (e < 0 ? rational(1n, 10n ** BigInt(-e)) : rational(10n ** BigInt(e)));

  /** Divide a positive rational by another. */
  const divide = (a, b) => rational(a.num * b.den, a.den * b.num);

  function reduce(a) {
    let [x, y] = [a.num < 0n ? -a.num : a.num, a.den];
    while (y) [x, y] = [y, x % y];
    return rational(a.num / x, a.den / x);
  }

  /** Largest e with 10^e <= a, for a > 0. */
  function magnitude(a) {
    const guess = a.num.toString().length - a.den.toString().length;
    return less(a, powerOfTen(guess)) ? guess - 1 : guess;
  }

  /** The nearest decimal with a fixed number of places. */
  function decimal(a, places) {
    const scaled = roundDiv(a.num * 10n ** BigInt(places), a.den);
    const digits = (scaled < 0n ? -scaled : scaled).toString().padStart(places + 1, "0");
    const whole = digits.slice(0, digits.length - places);
    const text = places ? `${whole}.${digits.slice(-places)}` : whole;
    return scaled < 0n ? `-${text}` : text;
  }

  /** The number itself: a terminating decimal where it is one, else p/q. */
  function text(a) {
    const { num, den } = reduce(a);
    let [rest, twos, fives] = [den, 0, 0];
    for (; rest % 2n === 0n; rest /= 2n) twos += 1;
    for (; rest % 5n === 0n; rest /= 5n) fives += 1;
    return rest === 1n ? decimal({ num, den }, Math.max(twos, fives)) : `${num}/${den}`;
  }

  /** Number of decimal places at which a step of this size is told apart. */
  const placesFor = (step) => Math.max(0, -magnitude(step));

  /** Inverse hyperbolic tangent of num/den, |num/den| < 1, times 2^bits, by its Taylor series. */
  function areaTangent(num, den, bits) {
    if (num < 0n) return -areaTangent(-num, den, bits);
    let power = (num << bits) / den;
    const square = ((num * num) << bits) / (den * den);
    let sum = 0n;
    for (let k = 1n; power; k += 2n) {
      sum += power / k;
      power = (power * square) >> bits;
    }
    return sum;
  }

  const GUARD = 32n;
  const halfLogOfTwo = (bits) => areaTangent(1n, 3n, bits);

  /** Natural logarithm of a > 0, times 2^bits. */
  function ln(a, bits) {
    const work = bits + GUARD;
    const shift = BigInt(a.num.toString(2).length - a.den.toString(2).length);
    const num = shift < 0n ? a.num << -shift : a.num;
    const den = shift > 0n ? a.den << shift : a.den;
    return (2n * (areaTangent(num - den, num + den, work) + shift * halfLogOfTwo(work))) >> GUARD;
  }

  /** exp(x / 2^bits) as a rational with about that many bits. */
  function exp(x, bits) {
    const work = bits + GUARD;
    const two = 2n * halfLogOfTwo(work);
    const shift = floorDiv(x << GUARD, two);
    const rest = (x << GUARD) - shift * two;
    let sum = 0n;
    for (let [term, k] = [1n << work, 1n]; term; k += 1n) {
      sum += term;
      term = ((term * rest) >> work) / k;
    }
    return shift < 0n ? rational(sum, 1n << (work - shift)) : rational(sum << shift, 1n << work);
  }

  return {
    rational, parse, floorDiv, ceilDiv, roundDiv, add, subtract, multiply, divide, scale, less, powerOfTen,
    reduce, magnitude, decimal, text, placesFor, ln, exp,
  };
})();
