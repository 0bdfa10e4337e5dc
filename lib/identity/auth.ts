import { betterAuth } from 'better-auth';
import { drizzleAdapter } from 'better-auth/adapters/drizzle';
import { APIError, createAuthMiddleware } from 'better-auth/api';
import { twoFactor } from 'better-auth/plugins';
import { eq } from 'drizzle-orm';
import { drizzle } from 'drizzle-orm/libsql';
import { queuedClient } from '@/db/queuedClient';
import * as schema from '@/db/schema';
import { appendEntries } from '@/lib/custody/append';
import { SERVICE_ACTOR } from '@/lib/custody/entry';
import { enqueueMail } from '@/lib/mail/enqueue';
import type { Services } from '@/lib/platform/services';
import { hashPassword, PASSWORD_LENGTH, passwordProblem, verifyPassword } from './password';
import { countWrongTry, forgetTries, secondsToWait } from './signInLimits';

type Needs = Pick<Services, 'database' | 'read' | 'write' | 'clock' | 'env' | 'log'>;

/** The field in which our own routes tell Better Auth where a request came from. */
export const PEER_FIELD = 'x-bellkeep-peer';

const SESSION_SECONDS = 12 * 3600;
const RESET_SECONDS = 3600;

const addressOf = (headers: Headers | undefined): string => headers?.get(PEER_FIELD) ?? 'unknown';

/**
 * Sign-in by Better Auth: passwords, sessions in the database, second factor, password reset by mail. People come by
 * invitation only, so nobody can sign up.
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
      password: { hash: hashPassword, verify: ({ hash, password }) => verifyPassword(hash, password) },
      resetPasswordTokenExpiresIn: RESET_SECONDS,
      revokeSessionsOnPasswordReset: true,
      sendResetPassword: async ({ user, token }) => {
        await services.write((tx) =>
          enqueueMail(tx, services.clock.now(), {
            to: user.email,
            subject: 'Set a new password for Bellkeep',
            text: `Somebody, probably you, asked to set a new password for ${user.email}.\n\nOpen this within an hour:\n${env.BELLKEEP_ORIGIN}/reset/${token}\n\nIf it was not you, leave it: nothing changes without this address.`,
          }),
        );
      },
      onPasswordReset: async ({ user }) => {
        await services.write((tx) =>
          appendEntries(tx, services.clock.now(), [
            {
              kind: 'password-reset',
              actor: { kind: 'person', id: user.id, label: user.name },
              subjects: [{ kind: 'person', id: user.id }],
            },
          ]),
        );
      },
    },
    session: { expiresIn: SESSION_SECONDS, updateAge: 15 * 60, cookieCache: { enabled: false } },
    rateLimit: {
      enabled: true,
      storage: 'database',
      window: 60,
      max: 120,
      customRules: {
        '/sign-in/email': { window: 60, max: 60 },
        '/request-password-reset': { window: 300, max: 5 },
        '/two-factor/*': { window: 60, max: 20 },
      },
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
    plugins: [twoFactor({ issuer: `Bellkeep, ${env.BELLKEEP_HOSPITAL}` })],
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
    hooks: {
      before: createAuthMiddleware(async (context) => {
        const body = (context.body ?? {}) as { email?: unknown; newPassword?: unknown };
        if (context.path === '/sign-in/email' && typeof body.email === 'string') {
          const wait = await secondsToWait(body.email.toLowerCase(), addressOf(context.headers));
          if (wait > 0)
            throw new APIError(
              'TOO_MANY_REQUESTS',
              { message: `Too many wrong tries. Try again in ${Math.ceil(wait / 60)} min.` },
              { 'retry-after': String(wait) },
            );
        }
        if (typeof body.newPassword === 'string') {
          const problem = passwordProblem(body.newPassword, [env.BELLKEEP_HOSPITAL]);
          if (problem) throw new APIError('BAD_REQUEST', { message: problem });
        }
      }),
      after: createAuthMiddleware(async (context) => {
        const address = addressOf(context.headers);
        const email = (context.body as { email?: unknown } | undefined)?.email;
        if (
          context.path === '/sign-in/email' &&
          context.context.returned instanceof APIError &&
          typeof email === 'string'
        ) {
          await countWrongTry(email.toLowerCase(), address);
          await noteRefused(services, email.toLowerCase());
          return;
        }
        const fresh = context.context.newSession;
        if (!fresh) return;
        await forgetTries(fresh.user.email.toLowerCase(), address);
        // Better Auth also makes a new session after a change of password or factor: those are entries of their own.
        if (/^\/(sign-in|two-factor\/verify)/.test(context.path)) await noteSignedIn(services, fresh.user);
      }),
    },
  });
}

export type Auth = ReturnType<typeof createAuth>;

const noteSignedIn = (services: Needs, user: { id: string; name: string }) =>
  services.write((tx) =>
    appendEntries(tx, services.clock.now(), [
      {
        kind: 'signed-in',
        actor: { kind: 'person', id: user.id, label: user.name },
        subjects: [{ kind: 'person', id: user.id }],
      },
    ]),
  );

/** Only tries for accounts that exist are entries: an address that somebody mistyped is nobody's business. */
async function noteRefused(services: Needs, email: string): Promise<void> {
  const [person] = await services.read
    .select({ id: schema.user.id })
    .from(schema.user)
    .where(eq(schema.user.email, email))
    .limit(1);
  if (!person) return;
  await services.write((tx) =>
    appendEntries(tx, services.clock.now(), [
      { kind: 'sign-in-refused', actor: SERVICE_ACTOR, subjects: [{ kind: 'person', id: person.id }] },
    ]),
  );
}

const shared = globalThis as { bellkeepAuth?: WeakMap<object, Auth> };

/** The auth of a set of services; made once for each. */
export function authOf(services: Needs): Auth {
  shared.bellkeepAuth ??= new WeakMap();
  const found = shared.bellkeepAuth.get(services.database) ?? createAuth(services);
  shared.bellkeepAuth.set(services.database, found);
  return found;
}
