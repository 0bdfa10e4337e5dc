import { createHash } from 'node:crypto';

/** What is kept of a token that was sent by mail: SHA-256, hex. The token has 256 random bits, so nothing slower is needed. */
export const tokenHash = (token: string): string => createHash('sha256').update(token).digest('hex');
