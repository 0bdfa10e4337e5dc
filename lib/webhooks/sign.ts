import { createHmac } from 'node:crypto';

/**
 * The fields by which a receiver knows that we sent it and when: HMAC-SHA-256 (RFC 2104) over id, time and body, joined
 * by full stops. A receiver refuses a time that is more than five minutes off and an id that it had before, and nobody
 * can send an old message again. While a secret is being replaced there are two signatures, either of which is right.
 *
 * @param nowMs UTC ms; in the field it is in seconds
 */
export function signatureFields(
  secrets: readonly string[],
  message: { id: string; body: string; nowMs: number },
): Record<string, string> {
  const timestamp = String(Math.floor(message.nowMs / 1000));
  const signatures = secrets.map(
    (secret) =>
      `v1,${createHmac('sha256', secret).update(`${message.id}.${timestamp}.${message.body}`).digest('base64')}`,
  );
  return {
    'webhook-id': message.id,
    'webhook-timestamp': timestamp,
    'webhook-signature': signatures.join(' '),
  };
}
