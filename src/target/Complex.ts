/** A complex number as plain data. */
export interface Complex {
  readonly re: number;
  readonly im: number;
}

/** A real number as a complex one. */
export function real(re: number): Complex {
  return { re, im: 0 };
}

/** a + b. */
export function addComplex(a: Complex, b: Complex): Complex {
  return { re: a.re + b.re, im: a.im + b.im };
}

/** a - b. */
export function subtractComplex(a: Complex, b: Complex): Complex {
  return { re: a.re - b.re, im: a.im - b.im };
}

/** -z. */
export function negateComplex({ re, im }: Complex): Complex {
  return { re: -re, im: -im };
}

/** a b; a real factor scales both parts, so that it never turns a zero into NaN or changes its sign. */
export function multiplyComplex(a: Complex, b: Complex): Complex {
  if (a.im === 0) return { re: a.re * b.re, im: a.re * b.im };
  if (b.im === 0) return { re: a.re * b.re, im: a.im * b.re };
  return { re: a.re * b.re - a.im * b.im, im: a.re * b.im + a.im * b.re };
}

/**
 * a / b with the larger part of b as the divisor (Smith, Commun. ACM 5, 435 (1962)): no overflow on the way.
 */
export function divideComplex(a: Complex, b: Complex): Complex {
  if (b.im === 0) return { re: a.re / b.re, im: a.im / b.re };
  if (Math.abs(b.re) >= Math.abs(b.im)) {
    const ratio = b.im / b.re;
    const divisor = b.re + b.im * ratio;
    return { re: (a.re + a.im * ratio) / divisor, im: (a.im - a.re * ratio) / divisor };
  }
  const ratio = b.re / b.im;
  const divisor = b.re * ratio + b.im;
  return { re: (a.re * ratio + a.im) / divisor, im: (a.im * ratio - a.re) / divisor };
}

/** Principal square root, cut along the negative real axis; no cancellation in either part. */
export function squareRoot({ re, im }: Complex): Complex {
  if (im === 0) return re >= 0 ? real(Math.sqrt(re)) : { re: 0, im: Math.sqrt(-re) };
  const larger = Math.sqrt((Math.hypot(re, im) + Math.abs(re)) / 2);
  const smaller = Math.abs(im) / (2 * larger);
  const sign = im < 0 ? -1 : 1;
  return re >= 0 ? { re: larger, im: sign * smaller } : { re: smaller, im: sign * larger };
}

/** e^z. */
export function exponential({ re, im }: Complex): Complex {
  const size = Math.exp(re);
  return im === 0 ? real(size) : { re: size * Math.cos(im), im: size * Math.sin(im) };
}

/**
 * The angle of z in (-pi, pi]. A zero imaginary part counts as +0: in -8 the sign is in front of both parts.
 */
export function angleOf({ re, im }: Complex): number {
  return Math.atan2(im + 0, re);
}

/** Principal natural logarithm, imaginary part in (-pi, pi]. */
export function logarithm(z: Complex): Complex {
  return { re: Math.log(Math.hypot(z.re, z.im)), im: angleOf(z) };
}

/**
 * a^b, principal value. A whole exponent up to 1024 is a chain of products, so that (1 + i)^2 is 2i exactly.
 */
export function power(a: Complex, b: Complex): Complex {
  if (b.im === 0 && a.im === 0 && (a.re >= 0 || Number.isInteger(b.re))) return real(a.re ** b.re);
  if (b.im === 0 && Number.isInteger(b.re) && Math.abs(b.re) <= 1024) return wholePower(a, b.re);
  if (a.re === 0 && a.im === 0) return b.re > 0 ? real(0) : { re: NaN, im: NaN };
  return exponential(multiplyComplex(b, logarithm(a)));
}

function wholePower(base: Complex, exponent: number): Complex {
  let result = real(1);
  let square = base;
  for (let left = Math.abs(exponent); left > 0; left = Math.floor(left / 2)) {
    if (left % 2 === 1) result = multiplyComplex(result, square);
    square = multiplyComplex(square, square);
  }
  return exponent < 0 ? divideComplex(real(1), result) : result;
}

/** sin z. */
export function sine({ re, im }: Complex): Complex {
  if (im === 0) return real(Math.sin(re));
  return { re: Math.sin(re) * Math.cosh(im), im: Math.cos(re) * Math.sinh(im) };
}

/** cos z. */
export function cosine({ re, im }: Complex): Complex {
  if (im === 0) return real(Math.cos(re));
  return { re: Math.cos(re) * Math.cosh(im), im: -Math.sin(re) * Math.sinh(im) };
}
