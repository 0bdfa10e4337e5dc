/** Why a proof, a head or a key is not accepted. Codes are stable. */
export type CustodyCode =
  | 'proof-size'
  | 'proof-index'
  | 'proof-length'
  | 'proof-hash'
  | 'proof-root'
  | 'note-malformed'
  | 'note-unsigned'
  | 'note-signature'
  | 'head-malformed'
  | 'head-origin'
  | 'key-malformed'
  | 'ed25519-missing';

/** A check that did not hold. The message says which value was expected and which was found, where there are two. */
export class CustodyError extends Error {
  override readonly name = 'CustodyError';
  constructor(
    readonly code: CustodyCode,
    detail: string,
  ) {
    super(`${code}: ${detail}`);
  }
}
