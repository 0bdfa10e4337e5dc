import { createHash, createSign, generateKeyPairSync, type KeyObject, randomBytes } from 'node:crypto';

/**
 * An authenticator in software, as far as tests need one: WebAuthn level 3, 6.1 (authenticator data), 6.5.4
 * (attestation object, format none), RFC 8949 (CBOR), RFC 9052 (COSE key).
 */
export interface SoftAuthenticator {
  id: string;
  counter: number;
  register(options: { challenge: string }, more?: Lie): Record<string, unknown>;
  sign(options: { challenge: string }, more?: Lie): Record<string, unknown>;
}

/** What it may say that is not so. */
export interface Lie {
  origin?: string;
  rpId?: string;
  userVerified?: boolean;
  counter?: number;
  challenge?: string;
  id?: string;
}

const UP = 0x01;
const UV = 0x04;
const ATTESTED = 0x40;

function head(major: number, value: number): Buffer {
  if (value < 24) return Buffer.from([(major << 5) | value]);
  if (value < 256) return Buffer.from([(major << 5) | 24, value]);
  return Buffer.from([(major << 5) | 25, value >> 8, value & 255]);
}
type Cbor = number | string | Uint8Array | Map<Cbor, Cbor>;
function cbor(value: Cbor): Buffer {
  if (typeof value === 'number') return value >= 0 ? head(0, value) : head(1, -1 - value);
  if (typeof value === 'string')
    return Buffer.concat([head(3, Buffer.byteLength(value)), Buffer.from(value)]);
  if (value instanceof Uint8Array) return Buffer.concat([head(2, value.length), value]);
  return Buffer.concat([head(5, value.size), ...[...value].flatMap(([k, v]) => [cbor(k), cbor(v)])]);
}

const sha256 = (data: Uint8Array | string) => createHash('sha256').update(data).digest();
const base64url = (bytes: Uint8Array) => Buffer.from(bytes).toString('base64url');

function coseKey(key: KeyObject): Buffer {
  const { x = '', y = '' } = key.export({ format: 'jwk' });
  return cbor(
    new Map<Cbor, Cbor>([
      [1, 2],
      [3, -7],
      [-1, 1],
      [-2, Buffer.from(x, 'base64url')],
      [-3, Buffer.from(y, 'base64url')],
    ]),
  );
}

/** @param origin of the page that it is used on */
export function softAuthenticator(origin: string): SoftAuthenticator {
  const { publicKey, privateKey } = generateKeyPairSync('ec', { namedCurve: 'P-256' });
  const credentialId = randomBytes(32);
  const id = base64url(credentialId);
  const clientData = (type: string, challenge: string, lie: Lie) =>
    Buffer.from(
      JSON.stringify({
        type,
        challenge: lie.challenge ?? challenge,
        origin: lie.origin ?? origin,
        crossOrigin: false,
      }),
    );
  const authData = (flags: number, counter: number, lie: Lie, more: Uint8Array = new Uint8Array()) => {
    const count = Buffer.alloc(4);
    count.writeUInt32BE(lie.counter ?? counter);
    const verified = lie.userVerified === false ? 0 : UV;
    return Buffer.concat([
      sha256(lie.rpId ?? new URL(origin).hostname),
      Buffer.from([UP | verified | flags]),
      count,
      more,
    ]);
  };
  const answer = (given: string, response: Record<string, unknown>) => ({
    id: given,
    rawId: given,
    type: 'public-key',
    clientExtensionResults: {},
    response,
  });
  const self: SoftAuthenticator = {
    id,
    counter: 0,
    register({ challenge }, lie = {}) {
      const client = clientData('webauthn.create', challenge, lie);
      const attested = Buffer.concat([
        Buffer.alloc(16),
        Buffer.from([0, credentialId.length]),
        credentialId,
        coseKey(publicKey),
      ]);
      const attestation = cbor(
        new Map<Cbor, Cbor>([
          ['fmt', 'none'],
          ['attStmt', new Map()],
          ['authData', authData(ATTESTED, self.counter, lie, attested)],
        ]),
      );
      return answer(id, {
        clientDataJSON: base64url(client),
        attestationObject: base64url(attestation),
        transports: ['internal'],
      });
    },
    sign({ challenge }, lie = {}) {
      self.counter++;
      const client = clientData('webauthn.get', challenge, lie);
      const data = authData(0, self.counter, lie);
      const signature = createSign('sha256')
        .update(Buffer.concat([data, sha256(client)]))
        .sign(privateKey);
      return answer(lie.id ?? id, {
        clientDataJSON: base64url(client),
        authenticatorData: base64url(data),
        signature: base64url(signature),
      });
    },
  };
  return self;
}
