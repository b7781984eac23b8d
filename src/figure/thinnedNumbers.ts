/**
 * 1, the last number, and the multiples of a round step between, such that neighbours are at least `distance`
 * apart.
 */
export function thinnedNumbers(count: number, distance: number): number[] {
  const step = [1, 5, 10, 20, 50, 100, 200, 500].find((candidate) => candidate >= distance) ?? 1000;
  const numbers = [1];
  for (let number = step; number < count; number += step) {
    if (number - 1 >= distance && count - number >= distance) numbers.push(number);
  }
  if (count - 1 >= distance) numbers.push(count);
  return numbers;
}
