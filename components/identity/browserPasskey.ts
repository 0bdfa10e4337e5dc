'use client';

import { startAuthentication, startRegistration } from '@simplewebauthn/browser';

type Making = Parameters<typeof startRegistration>[0]['optionsJSON'];
type Showing = Parameters<typeof startAuthentication>[0]['optionsJSON'];

/** Have the browser make a passkey; null when the person or the browser did not. */
export async function makePasskey(options: unknown): Promise<unknown | null> {
  try {
    return await startRegistration({ optionsJSON: options as Making });
  } catch {
    return null;
  }
}

/** Have the browser show a passkey; null when the person or the browser did not. */
export async function passkeyAnswer(options: unknown): Promise<unknown | null> {
  try {
    return await startAuthentication({ optionsJSON: options as Showing });
  } catch {
    return null;
  }
}
