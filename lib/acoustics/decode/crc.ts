/** Tables of cyclic redundancy checks whose polynomial is taken with the highest bit first and that start at 0. */
function table(width: 8 | 16 | 32, polynomial: number): Uint32Array {
  const top = 2 ** (width - 1);
  const mask = 2 ** width - 1;
  return Uint32Array.from({ length: 256 }, (_, byte) => {
    let value = (byte << (width - 8)) >>> 0;
    for (let bit = 0; bit < 8; bit++)
      value = ((value & top) !== 0 ? (value << 1) ^ polynomial : value << 1) & mask;
    return value >>> 0;
  });
}

const CRC8 = table(8, 0x07);
const CRC16 = table(16, 0x8005);
const CRC32 = table(32, 0x04c1_1db7);

/** Over a FLAC frame header (RFC 9639, 9.1.8). */
export function crc8(bytes: Uint8Array, from: number, to: number): number {
  let crc = 0;
  for (let i = from; i < to; i++) crc = CRC8[crc ^ (bytes[i] as number)] as number;
  return crc;
}

/** Over a FLAC frame (RFC 9639, 9.3). */
export function crc16(bytes: Uint8Array, from: number, to: number): number {
  let crc = 0;
  for (let i = from; i < to; i++)
    crc = ((crc << 8) & 0xffff) ^ (CRC16[(crc >>> 8) ^ (bytes[i] as number)] as number);
  return crc;
}

/** Over an Ogg page whose own checksum, bytes 22 to 25, is taken as zero (RFC 3533, 6). */
export function oggCrc(page: Uint8Array): number {
  let crc = 0;
  for (let i = 0; i < page.length; i++) {
    const byte = i >= 22 && i < 26 ? 0 : (page[i] as number);
    crc = (crc << 8) ^ (CRC32[(crc >>> 24) ^ byte] as number);
  }
  return crc >>> 0;
}
