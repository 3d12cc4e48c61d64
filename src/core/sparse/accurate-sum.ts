/** Sum with the rounding errors carried along (Neumaier 1974): accurate to a few units in the last place of the largest partial sum. */
export function accurateSum(values: ArrayLike<number>): number {
  let sum = 0;
  let carried = 0;
  for (let k = 0; k < values.length; k++) {
    const value = values[k];
    const next = sum + value;
    carried += Math.abs(sum) >= Math.abs(value) ? sum - next + value : value - next + sum;
    sum = next;
  }
  return sum + carried;
}
