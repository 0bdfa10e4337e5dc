import { fuzzDecode } from './decode';

/** The process that `run.ts` watches: it says which case it begins, and its report at the end. */
const [seed, endsAt, first, cases] = process.argv.slice(2).map(Number) as [number, number, number, number];
const report = await fuzzDecode(
  seed,
  (done) => done < cases && Date.now() < endsAt,
  (index, name) => process.send?.({ begins: index, name }),
  first,
);
process.send?.({ report }, () => process.exit(0));
