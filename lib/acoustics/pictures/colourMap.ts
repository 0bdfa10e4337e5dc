/** Dark blue to yellow, even in lightness, and told apart with every kind of colour vision. */
const ANCHORS = [
  [0, 32, 76],
  [40, 62, 110],
  [87, 92, 109],
  [124, 123, 120],
  [165, 155, 115],
  [212, 189, 98],
  [255, 233, 69],
] as const;

/** 256 entries of red, green and blue. */
export const COLOUR_MAP: Uint8Array = Uint8Array.from({ length: 256 * 3 }, (_, i) => {
  const at = (Math.floor(i / 3) / 255) * (ANCHORS.length - 1);
  const low = Math.min(ANCHORS.length - 2, Math.floor(at));
  const channel = i % 3;
  const from = ANCHORS[low]?.[channel] ?? 0;
  const to = ANCHORS[low + 1]?.[channel] ?? 0;
  return Math.round(from + (to - from) * (at - low));
});
