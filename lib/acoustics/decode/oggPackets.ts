import type { OggPage } from './oggPages';

/** Puts the packets of one logical stream together (RFC 3533, 5). */
export class OggPackets {
  #packet = new Uint8Array(4096);
  #filled = 0;
  /** Whether a packet is under way, and whether its beginning was lost or it is longer than is kept. */
  #underWay = false;
  #spoilt = false;
  #sequence: number | null = null;

  constructor(private readonly oddities: Set<string>) {}

  /**
   * @param most bytes of a packet that are kept; a longer one is given as null
   * @param onPacket given each packet that ends on the page, as an array of its own; null where it is not whole
   */
  page(page: OggPage, most: number, onPacket: (packet: Uint8Array | null) => void): void {
    const inOrder = this.#sequence === null || page.sequence === (this.#sequence + 1) >>> 0;
    this.#sequence = page.sequence;
    if (!inOrder) this.oddities.add('pages-missing');
    if (this.#underWay && (!inOrder || !page.continued)) this.#reset(false);
    if (!this.#underWay && page.continued) {
      this.#reset(true);
      this.#spoilt = true;
    }
    let at = 0;
    for (const length of page.lacing) {
      this.#underWay = true;
      this.#append(page.body, at, length, most);
      at += length;
      if (length === 255) continue;
      const whole = !this.#spoilt;
      onPacket(whole ? this.#packet.slice(0, this.#filled) : null);
      this.#reset(false);
    }
  }

  #reset(underWay: boolean): void {
    this.#filled = 0;
    this.#underWay = underWay;
    this.#spoilt = false;
  }

  #append(body: Uint8Array, at: number, length: number, most: number): void {
    if (this.#spoilt) return;
    const needed = this.#filled + length;
    if (needed > most) {
      this.#spoilt = true;
      return;
    }
    if (needed > this.#packet.length) {
      const grown = new Uint8Array(2 * needed);
      grown.set(this.#packet.subarray(0, this.#filled));
      this.#packet = grown;
    }
    this.#packet.set(body.subarray(at, at + length), this.#filled);
    this.#filled = needed;
  }
}
