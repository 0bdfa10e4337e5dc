import { createCipheriv, createDecipheriv, randomBytes } from 'node:crypto';

/**
 * Secrets at rest: AES-256-GCM (NIST SP 800-38D) under a key from the environment, with a fresh 96-bit nonce.
 * `context` is authenticated with it, so that a box cannot be moved to another row.
 */
export interface SecretBox {
  /** @returns `v1.` and base64url of nonce, tag and ciphertext */
  seal(plain: string, context: string): string;
  /** @throws Error when the key, the context or a byte is not the one it was sealed with */
  open(box: string, context: string): string;
}

const NONCE = 12;
const TAG = 16;

/** @param key 32 bytes */
export function createSecretBox(key: Uint8Array): SecretBox {
  if (key.length !== 32) throw new Error('the key for secrets at rest is 32 bytes');
  return {
    seal(plain, context) {
      const nonce = randomBytes(NONCE);
      const cipher = createCipheriv('aes-256-gcm', key, nonce).setAAD(Buffer.from(context));
      const body = Buffer.concat([cipher.update(plain, 'utf8'), cipher.final()]);
      return `v1.${Buffer.concat([nonce, cipher.getAuthTag(), body]).toString('base64url')}`;
    },
    open(box, context) {
      if (!box.startsWith('v1.')) throw new Error('not a sealed secret');
      const bytes = Buffer.from(box.slice(3), 'base64url');
      const decipher = createDecipheriv('aes-256-gcm', key, bytes.subarray(0, NONCE))
        .setAAD(Buffer.from(context))
        .setAuthTag(bytes.subarray(NONCE, NONCE + TAG));
      return Buffer.concat([decipher.update(bytes.subarray(NONCE + TAG)), decipher.final()]).toString('utf8');
    },
  };
}
