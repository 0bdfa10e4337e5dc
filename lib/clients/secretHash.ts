import { createHash } from 'node:crypto';

/** What is kept of a client's secret. It has 256 random bits, so nothing slower than SHA-256 is needed. */
export const secretHash = (secret: string): string => createHash('sha256').update(secret).digest('hex');
