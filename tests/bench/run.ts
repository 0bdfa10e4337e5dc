import type { Figure } from './figure';
import { ingest } from './ingest';
import { latency } from './latency';
import { log } from './log';

const BENCHES: Record<string, () => Promise<Figure[]>> = { ingest, latency, log };

const [name, ...rest] = process.argv.slice(2);
const bench = BENCHES[name ?? ''];
if (!bench) {
  console.error(`npm run bench -- NAME [--json]\n\nNAME is one of: ${Object.keys(BENCHES).join(', ')}`);
  process.exit(2);
}
const figures = await bench();
for (const figure of figures) {
  if (rest.includes('--json')) console.log(JSON.stringify(figure));
  else
    console.log(
      `${figure.name.padEnd(44)} ${figure.value.toFixed(figure.value < 10 ? 2 : 0).padStart(8)} ${figure.unit}${figure.target === null ? '' : `  (target ${figure.target}, ${figure.ok ? 'met' : 'missed'})`}`,
    );
}
