import { parseArgs } from 'node:util';
import { applyMigrations } from '@/db/migrate';
import { bringTreeUp } from '@/lib/custody/tree/grow';
import { createServices } from '@/lib/http/services';
import { FirstInvitation, inviteFirst } from '@/lib/identity/inviteFirst';
import { readEnv } from '@/lib/platform/env';
import { Refusal } from '@/lib/platform/errors';

const USAGE = 'npm run invite -- --email ADDRESS --name NAME [--role itadmin] [--force]';

/** The arguments, or what is wrong with them. */
function readArguments(): FirstInvitation | string {
  try {
    const { values } = parseArgs({
      options: {
        email: { type: 'string', default: '' },
        name: { type: 'string', default: '' },
        role: { type: 'string', default: 'itadmin' },
        force: { type: 'boolean', default: false },
      },
    });
    const parsed = FirstInvitation.safeParse(values);
    return parsed.success ? parsed.data : parsed.error.issues.map(({ message }) => message).join('; ');
  } catch (error) {
    return error instanceof Error ? error.message : 'the arguments are not right';
  }
}

const wanted = readArguments();
if (typeof wanted === 'string') {
  console.error(`${wanted}\n${USAGE}`);
  process.exit(2);
}
const services = await createServices(readEnv({ LOG_LEVEL: 'warn', ...process.env }));
try {
  await applyMigrations(services.database);
  await bringTreeUp(services);
  const { address, expiresAt } = await inviteFirst(services, wanted);
  console.log(address);
  console.error(
    `For ${wanted.name}, as ${wanted.role}. It works once, until ${new Date(expiresAt).toISOString()}.`,
  );
} catch (error) {
  if (!(error instanceof Refusal)) throw error;
  console.error(error.detail ?? error.code);
  process.exitCode = 1;
} finally {
  services.database.close();
}
