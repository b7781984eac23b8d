/**
 * Sum of `term(values[i])` in the order of the array, with the rounding of every addition carried along
 * (Neumaier, Z. Angew. Math. Mech. 54, 39 (1974)): the error is that of the last rounding, not of a million.
 * Same input, same bits.
 */
export function compensatedSum(values: Float64Array, term: (value: number) => number = itself): number {
  let sum = 0;
  let lost = 0;
  for (const value of values) {
    const next = term(value);
    const larger = sum + next;
    lost += Math.abs(sum) >= Math.abs(next) ? sum - larger + next : next - larger + sum;
    sum = larger;
  }
  return sum + lost;
}

function itself(value: number): number {
  return value;
}
