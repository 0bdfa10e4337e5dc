import { betterAuth } from 'better-auth';
import { drizzleAdapter } from 'better-auth/adapters/drizzle';
import { twoFactor } from 'better-auth/plugins';
import { eq } from 'drizzle-orm';
import { drizzle } from 'drizzle-orm/libsql';
import { queuedClient } from '@/db/queuedClient';
import * as schema from '@/db/schema';
import type { Services } from '@/lib/platform/services';
import { ourSessions } from './ourSessions';
import { hashPassword, PASSWORD_LENGTH, verifyPassword } from './password';

type Needs = Pick<Services, 'database' | 'read' | 'env' | 'log'>;

/** The field in which our own routes tell Better Auth where a request came from. */
export const PEER_FIELD = 'x-bellkeep-peer';

/** A session lasts one shift, whatever is done in it, and ends when nothing was done in it for a while. */
export const SESSION_SECONDS = 12 * 3600;
export const IDLE_MS = 2 * 3_600_000;

/**
 * Sign-in by Better Auth: it checks passwords and second factors and keeps sessions in the database. People come by
 * invitation only; new passwords, roles and everything that is an entry of the custody log are our own verbs.
 */
export function createAuth(services: Needs) {
  const { env } = services;
  const store = drizzle(queuedClient(services.database), { schema });
  return betterAuth({
    appName: 'Bellkeep',
    baseURL: env.BELLKEEP_ORIGIN,
    basePath: '/api/auth',
    secret: env.BELLKEEP_AUTH_SECRET,
    trustedOrigins: [env.BELLKEEP_ORIGIN],
    telemetry: { enabled: false },
    database: drizzleAdapter(store, { provider: 'sqlite', schema, transaction: false }),
    emailAndPassword: {
      enabled: true,
      disableSignUp: true,
      minPasswordLength: PASSWORD_LENGTH.least,
      maxPasswordLength: PASSWORD_LENGTH.most,
      // Called for unknown accounts too, so that both take the same time.
      password: { hash: hashPassword, verify: ({ hash, password }) => verifyPassword(hash, password) },
    },
    session: { expiresIn: SESSION_SECONDS, disableSessionRefresh: true, cookieCache: { enabled: false } },
    rateLimit: {
      enabled: true,
      storage: 'database',
      window: 60,
      max: 300,
      // By address: a whole hospital may stand behind one. Accounts have limits of their own (signInLimits.ts).
      customRules: { '/sign-in/email': { window: 60, max: 120 }, '/two-factor/*': { window: 60, max: 120 } },
    },
    advanced: {
      cookiePrefix: 'bellkeep',
      useSecureCookies: env.BELLKEEP_ORIGIN.startsWith('https:'),
      ipAddress: { ipAddressHeaders: [PEER_FIELD] },
      defaultCookieAttributes: { httpOnly: true, sameSite: 'lax' },
    },
    logger: {
      level: 'error',
      log: (level, message) =>
        services.log[level === 'error' ? 'error' : 'info']({ from: 'better-auth' }, message),
    },
    plugins: [twoFactor({ issuer: `Bellkeep, ${env.BELLKEEP_HOSPITAL}` }), ourSessions()],
    databaseHooks: {
      session: {
        create: {
          before: async (session) => {
            const [person] = await services.read
              .select({ leftAt: schema.user.leftAt })
              .from(schema.user)
              .where(eq(schema.user.id, session.userId))
              .limit(1);
            return person && person.leftAt === null ? undefined : false;
          },
        },
      },
    },
  });
}

export type Auth = ReturnType<typeof createAuth>;

const shared = globalThis as { bellkeepAuth?: WeakMap<object, Auth> };

/** The auth of a set of services; made once for each. */
export function authOf(services: Needs): Auth {
  shared.bellkeepAuth ??= new WeakMap();
  const found = shared.bellkeepAuth.get(services.database) ?? createAuth(services);
  shared.bellkeepAuth.set(services.database, found);
  return found;
}
