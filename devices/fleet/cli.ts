import { readFileSync } from 'node:fs';
import { parseArgs } from 'node:util';
import { z } from 'zod';
import { runFleet } from './fleet';

const HELP = `npm run fleet -- --origin URL --codes FILE --state FOLDER [--pace CLIPS] [--minutes M] [--seed S]

  --origin   address of the service
  --codes    JSON: [{ "serialNumber", "code", "sampleRateHz", "firmware" }]; code null where the state folder has a credential
  --state    where the devices keep their keys and credentials
  --pace     clips a minute over the whole fleet (4)
  --minutes  end after so long (runs until it is stopped)
  --seed     the same seed gives the same sounds (1)`;

const Codes = z.array(
  z.object({
    serialNumber: z.string(),
    code: z.string().nullable(),
    sampleRateHz: z.number(),
    firmware: z.string(),
  }),
);

const { values } = parseArgs({
  options: {
    origin: { type: 'string' },
    codes: { type: 'string' },
    state: { type: 'string' },
    pace: { type: 'string', default: '4' },
    minutes: { type: 'string' },
    seed: { type: 'string', default: '1' },
    help: { type: 'boolean', default: false },
  },
});
if (values.help || !values.origin || !values.codes || !values.state) {
  console.log(HELP);
  process.exit(values.help ? 0 : 2);
}
const ending = new AbortController();
for (const signal of ['SIGINT', 'SIGTERM'] as const) process.on(signal, () => ending.abort());
if (values.minutes) setTimeout(() => ending.abort(), Number(values.minutes) * 60_000).unref();
await runFleet(
  {
    origin: values.origin,
    devices: Codes.parse(JSON.parse(readFileSync(values.codes, 'utf8'))),
    seed: Number(values.seed),
    pace: Number(values.pace),
    stateFolder: values.state,
    onEvent: (text) => console.log(`${new Date().toISOString()} ${text}`),
  },
  ending.signal,
);
