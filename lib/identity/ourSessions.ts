import type { BetterAuthPlugin } from 'better-auth';
import { createAuthEndpoint } from 'better-auth/api';
import { setSessionCookie } from 'better-auth/cookies';
import { generateRandomString } from 'better-auth/crypto';
import { z } from 'zod';

const CHALLENGE_SECONDS = 600;

/**
 * Better Auth's part of signing in somebody who was recognised without a password: its session and cookie, or its
 * challenge for the second factor, exactly as after a password. No request reaches it: it is called from here alone.
 */
export const ourSessions = () =>
  ({
    id: 'bellkeep-sessions',
    endpoints: {
      openSession: createAuthEndpoint(
        '/bellkeep/open-session',
        {
          method: 'POST',
          body: z.object({ personId: z.string(), secondFactorPassed: z.boolean() }),
          metadata: { SERVER_ONLY: true },
        },
        async (ctx) => {
          const { internalAdapter, secret } = ctx.context;
          const user = await internalAdapter.findUserById(ctx.body.personId);
          if (!user) return ctx.json({ next: 'refused' as const });
          const { twoFactorEnabled } = user as { twoFactorEnabled?: unknown };
          if (twoFactorEnabled === true && !ctx.body.secondFactorPassed) {
            const cookie = ctx.context.createAuthCookie('two_factor', { maxAge: CHALLENGE_SECONDS });
            const identifier = `2fa-${generateRandomString(20)}`;
            const expiresAt = new Date(Date.now() + CHALLENGE_SECONDS * 1000);
            await internalAdapter.createVerificationValue({ value: user.id, identifier, expiresAt });
            await internalAdapter.createVerificationValue({
              value: '0',
              identifier: `2fa-attempts-${identifier}`,
              expiresAt,
            });
            await ctx.setSignedCookie(cookie.name, identifier, secret, cookie.attributes);
            return ctx.json({ next: 'second-factor' as const });
          }
          const session = await internalAdapter.createSession(user.id, false);
          if (!session) return ctx.json({ next: 'refused' as const });
          await setSessionCookie(ctx, { session, user }, false);
          return ctx.json({ next: 'in' as const });
        },
      ),
    },
  }) satisfies BetterAuthPlugin;
