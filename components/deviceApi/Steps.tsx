import type { ReactNode } from 'react';

const STEPS: { title: string; text: ReactNode }[] = [
  {
    title: 'Make a key pair',
    text: 'P-256 or Ed25519, on the device, once. The private half never leaves it; in a secure element where there is one.',
  },
  {
    title: 'Enrol',
    text: 'Read the address and the one-time code off the enrolment sheet (its QR code holds both). Post code, serial number, public key and a proof: a JWS with typ enrolment-proof+jwt over the origin, the serial number and the code. The code lives a day and five tries.',
  },
  {
    title: 'Prove the key with every call',
    text: 'The credential is an access token bound to the key. Each call sends it as Authorization: DPoP, with a fresh proof in the field DPoP (RFC 9449): method, address, hash of the token, a jti used once, and the nonce. The nonce stands in the field DPoP-Nonce of every answer and lives five to ten minutes. A device whose clock is years off is let in: proofs live by the nonce, not by iat.',
  },
  {
    title: 'Ask for an upload slot',
    text: 'Announce a recording by its number, length, SHA-256 and media type. Say what your clock says now: recorded times are corrected by the difference.',
  },
  {
    title: 'Put the bytes',
    text: 'To the presigned address, with exactly the header fields of the slot, within five minutes. Other bytes are refused. Ask for the slot again when it has ended: the same number gets a fresh address.',
  },
  {
    title: 'Complete',
    text: 'The answer is the verdict with its reasons. Show it at once: recording again costs ten seconds while the chestpiece is still there. Bellkeep judges technical quality and never diagnoses.',
  },
  {
    title: 'Send a heartbeat',
    text: 'About once a minute while on. The answer says the time, whether to renew, and which listening session the device is in.',
  },
  {
    title: 'Renew',
    text: 'From renewAfter on, or when an answer says renew. The old credential works until the new one is first used. A credential that has ended is refused, and its use is an alarm.',
  },
  {
    title: 'When no answer comes',
    text: 'Repeat the same call. Enrolment, slot, complete and renewal give the same result again. Keep a clip on the device until complete has answered, wait as long as Retry-After says, and grow the pauses between tries, with some chance in them.',
  },
];

/** What a device does, in order. */
export function Steps() {
  return (
    <ol className="grid max-w-line list-decimal gap-4 pl-6">
      {STEPS.map(({ title, text }) => (
        <li key={title}>
          <b>{title}.</b> {text}
        </li>
      ))}
    </ol>
  );
}
