/** What another system may be allowed to read, each by its own scope (RFC 6749, 3.3). */
export const SCOPES = {
  'recordings.read': 'Recordings: number, device, verdict, hash, encounter number. No patient, no sound.',
  'devices.read': 'Devices: asset tag, serial number, model, ward, state, firmware, last heard.',
  'ledger.read': 'The custody log: entries as they are hashed.',
} as const;
export type Scope = keyof typeof SCOPES;
export const SCOPE_NAMES = Object.keys(SCOPES) as [Scope, ...Scope[]];
