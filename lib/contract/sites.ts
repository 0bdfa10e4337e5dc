/**
 * Where on the body the chestpiece was put. `x` and `y` place the mark on the body map in percent of one view;
 * seen from the back the patient's left is on the reader's left, from the front on the reader's right.
 * The ten lung sites in this order: common practice, no source. Follow local policy.
 */
export const SITES = [
  { id: 'back-upper-right', number: 1, label: 'Right upper back', view: 'back', x: 62, y: 29 },
  { id: 'back-upper-left', number: 2, label: 'Left upper back', view: 'back', x: 38, y: 29 },
  { id: 'back-lower-left', number: 3, label: 'Left lower back', view: 'back', x: 36.5, y: 54 },
  { id: 'back-lower-right', number: 4, label: 'Right lower back', view: 'back', x: 63.5, y: 54 },
  { id: 'back-base-right', number: 5, label: 'Right base, back', view: 'back', x: 66.5, y: 77 },
  { id: 'back-base-left', number: 6, label: 'Left base, back', view: 'back', x: 33.5, y: 77 },
  { id: 'front-upper-right', number: 7, label: 'Right upper front', view: 'front', x: 39, y: 27 },
  { id: 'front-upper-left', number: 8, label: 'Left upper front', view: 'front', x: 61, y: 27 },
  { id: 'front-lower-right', number: 9, label: 'Right lower front', view: 'front', x: 35.5, y: 58 },
  { id: 'front-lower-left', number: 10, label: 'Left lower front', view: 'front', x: 64.5, y: 58 },
] as const;

export type SiteId = (typeof SITES)[number]['id'];
export const SITE_IDS = SITES.map((site) => site.id) as [SiteId, ...SiteId[]];
export const siteOf = (id: string | null | undefined) => SITES.find((site) => site.id === id) ?? null;
