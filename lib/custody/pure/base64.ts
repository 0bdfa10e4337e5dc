/** Standard base64 with padding (RFC 4648, 4), the same in a browser and in Node. */
export function toBase64(bytes: Uint8Array): string {
  let text = '';
  for (const byte of bytes) text += String.fromCharCode(byte);
  return btoa(text);
}

/** Bytes of standard base64; null where it is none or not written the one canonical way. */
export function fromBase64(text: string): Uint8Array | null {
  if (!/^[A-Za-z0-9+/]*={0,2}$/.test(text) || text.length % 4 !== 0) return null;
  const bytes = Uint8Array.from(atob(text), (c) => c.charCodeAt(0));
  return toBase64(bytes) === text ? bytes : null;
}
