import { crc32 as zlibCrc32 } from 'node:zlib';

/** A checksum taken piece by piece. */
export interface Running {
  update(data: Uint8Array): void;
  /** Big-endian, as the `x-amz-checksum-…` headers carry it before base64. */
  digest(): Buffer;
}

export function crc32(): Running {
  let value = 0;
  return {
    update(data) {
      value = zlibCrc32(data, value);
    },
    digest: () => bigEndian(value),
  };
}

const bigEndian = (value: number): Buffer => {
  const bytes = Buffer.alloc(4);
  bytes.writeUInt32BE(value >>> 0);
  return bytes;
};

/** Castagnoli polynomial, reflected (RFC 3720, 12.1 and appendix B.4). */
const CASTAGNOLI = 0x82f63b78;

/** Slicing by eight: TABLES[k] carries a byte that stands k places further ahead. */
const TABLES: Uint32Array[] = (() => {
  const first = new Uint32Array(256);
  for (let i = 0; i < 256; i++) {
    let value = i;
    for (let bit = 0; bit < 8; bit++) value = value & 1 ? (value >>> 1) ^ CASTAGNOLI : value >>> 1;
    first[i] = value;
  }
  const tables = [first];
  for (let k = 1; k < 8; k++) {
    const before = tables[k - 1] as Uint32Array;
    tables.push(before.map((value) => (value >>> 8) ^ (first[value & 0xff] as number)));
  }
  return tables;
})();

export function crc32c(): Running {
  const [t0, t1, t2, t3, t4, t5, t6, t7] = TABLES as unknown as [
    Uint32Array,
    Uint32Array,
    Uint32Array,
    Uint32Array,
    Uint32Array,
    Uint32Array,
    Uint32Array,
    Uint32Array,
  ];
  let crc = 0xffffffff;
  const at = (table: Uint32Array, index: number): number => table[index & 0xff] as number;
  return {
    update(data) {
      let i = 0;
      const view = new DataView(data.buffer, data.byteOffset, data.byteLength);
      for (; i + 8 <= data.length; i += 8) {
        const low = crc ^ view.getUint32(i, true);
        const high = view.getUint32(i + 4, true);
        crc =
          at(t7, low) ^
          at(t6, low >>> 8) ^
          at(t5, low >>> 16) ^
          at(t4, low >>> 24) ^
          at(t3, high) ^
          at(t2, high >>> 8) ^
          at(t1, high >>> 16) ^
          at(t0, high >>> 24);
      }
      for (; i < data.length; i++) crc = (crc >>> 8) ^ at(t0, crc ^ (data[i] as number));
    },
    digest: () => bigEndian(crc ^ 0xffffffff),
  };
}

/** CRC-64/NVME: NVM Express NVM Command Set specification; polynomial reflected, as two halves of 32 bits. */
const NVME_HIGH = 0x9a6c9329;
const NVME_LOW = 0xac4bc9b5;

const [NVME_TABLE_HIGH, NVME_TABLE_LOW] = (() => {
  const [high, low] = [new Uint32Array(256), new Uint32Array(256)];
  for (let i = 0; i < 256; i++) {
    let [h, l] = [0, i];
    for (let bit = 0; bit < 8; bit++) {
      const odd = l & 1;
      l = (l >>> 1) | ((h & 1) << 31);
      h >>>= 1;
      if (odd) [h, l] = [h ^ NVME_HIGH, l ^ NVME_LOW];
    }
    [high[i], low[i]] = [h, l];
  }
  return [high, low];
})();

export function crc64nvme(): Running {
  let [high, low] = [0xffffffff, 0xffffffff];
  return {
    update(data) {
      for (let i = 0; i < data.length; i++) {
        const index = (low ^ (data[i] as number)) & 0xff;
        low = ((low >>> 8) | (high << 24)) ^ (NVME_TABLE_LOW[index] as number);
        high = (high >>> 8) ^ (NVME_TABLE_HIGH[index] as number);
      }
    },
    digest: () => Buffer.concat([bigEndian(high ^ 0xffffffff), bigEndian(low ^ 0xffffffff)]),
  };
}
