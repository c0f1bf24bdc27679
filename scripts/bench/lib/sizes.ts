/** How many samples each of three measurements is made of; `EVENFALL_BENCH_SIZES=1000,3000,10000` asks for others, for a quick look. */
export function sizesOf(usual: readonly number[]): number[] {
  const wanted = process.env.EVENFALL_BENCH_SIZES;
  if (wanted === undefined || wanted === '') return [...usual];
  const sizes = wanted.split(',').map(Number);
  if (sizes.length < 2 || sizes.some((size) => !Number.isInteger(size) || size < 1000))
    throw new Error(`EVENFALL_BENCH_SIZES is "${wanted}"; two or more whole numbers from 1000 on are wanted, with commas between them`);
  return sizes;
}
