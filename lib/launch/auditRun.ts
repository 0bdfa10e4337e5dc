import { existsSync, readFileSync } from 'node:fs';
import { join } from 'node:path';
import { type AuditResult, auditCustody } from '@/lib/custody/audit/audit';
import { AUDIT_CODES, type Finding } from '@/lib/custody/audit/findings';
import { createServices } from '@/lib/http/services';
import { readEnv } from '@/lib/platform/env';
import { localSettings } from './settings.mjs';

const USAGE = `npm run custody:audit -- [--json] [--heads FILE]... [--key LINE]... [--no-bytes]

Recomputes the custody log from its entries and holds it against the heads in the database, in storage and in
letters to the auditors, and every original and picture against its entries. Writes nothing.

  --heads FILE  a letter to the auditors, or any text with heads in it
  --key LINE    the verifier key you were sent first; without it the database's own keys are believed
  --no-bytes    look at presence, length and lock of objects, not at their bytes
  --json        one object a line: findings, then { "ok", "entries", … }

Ends with 0 when nothing is wrong, 1 when something is, 2 when it could not be done.`;

interface Arguments {
  json: boolean;
  headFiles: string[];
  keys: string[];
  withBytes: boolean;
}

function readArguments(args: string[]): Arguments | null {
  const read: Arguments = { json: false, headFiles: [], keys: [], withBytes: true };
  for (let i = 0; i < args.length; i++) {
    const arg = args[i];
    const value = args[i + 1];
    if (arg === '--json') read.json = true;
    else if (arg === '--no-bytes') read.withBytes = false;
    else if (arg === '--heads' && value !== undefined) read.headFiles.push(args[++i] as string);
    else if (arg === '--key' && value !== undefined) read.keys.push(args[++i] as string);
    else return null;
  }
  return read;
}

/** Settings of the environment; without any, those of the demo house in this folder. */
function settings(): Record<string, string | undefined> {
  const ports = join('.data', 'ports.json');
  if (process.env.S3_ENDPOINT || !existsSync(ports)) return process.env;
  const { web, storage } = JSON.parse(readFileSync(ports, 'utf8')) as { web: number; storage: number };
  return { ...localSettings({ folder: '.data', webPort: web, storagePort: storage }), ...process.env };
}

const line = ({ code, sequence, recording, size, key, detail }: Finding): string =>
  [
    code.padEnd(22),
    [
      sequence === undefined ? '' : `entry ${sequence}`,
      size === undefined ? '' : `head ${size}`,
      recording ?? '',
      key ?? '',
    ]
      .filter(Boolean)
      .join(', '),
    detail,
  ]
    .filter(Boolean)
    .join('  ');

function summary(result: AuditResult): string {
  const { entries, heads, objects, counts } = result;
  const read = `${entries} entries; heads: ${heads.database} in the database, ${heads.storage} in storage, ${heads.mail} in letters; ${objects.originals} originals, ${objects.derived} pictures.`;
  if (result.ok) return `${read}\nNothing is wrong.`;
  const named = Object.entries(counts).map(
    ([code, count]) => `  ${String(count).padStart(5)}  ${code}: ${AUDIT_CODES[code as Finding['code']]}`,
  );
  return `${read}\nSomething is wrong:\n${named.join('\n')}`;
}

async function main(): Promise<number> {
  const wanted = readArguments(process.argv.slice(2));
  if (!wanted) {
    console.error(USAGE);
    return 2;
  }
  const env = readEnv({ ...settings(), LOG_LEVEL: 'silent' });
  const file = env.DATABASE_URL.replace(/^file:/, '');
  if (env.DATABASE_URL.startsWith('file:') && !existsSync(file))
    throw new Error(`There is no database at ${file}.`);
  const services = await createServices(env);
  try {
    const result = await auditCustody(services, {
      ...wanted,
      onFinding: (finding) => console.log(wanted.json ? JSON.stringify(finding) : line(finding)),
    });
    console.log(wanted.json ? JSON.stringify(result) : summary(result));
    return result.ok ? 0 : 1;
  } finally {
    services.database.close();
  }
}

main().then(
  (code) => process.exit(code),
  (error: unknown) => {
    console.error(`The audit could not be done: ${error instanceof Error ? error.message : String(error)}`);
    process.exit(2);
  },
);
