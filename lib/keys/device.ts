import type { device, deviceModel } from '@/db/schema';
import type { Actor } from '@/lib/custody/entry';
import type { CredentialRow } from './token';

export type DeviceRow = typeof device.$inferSelect;
export type DeviceModelRow = typeof deviceModel.$inferSelect;

declare const authenticated: unique symbol;

/** A device whose token, proof and state were checked in this request. Made by `lib/credentials` alone. */
export interface AuthenticatedDevice {
  readonly [authenticated]: true;
  device: DeviceRow;
  model: DeviceModelRow;
  credential: CredentialRow;
}

export const deviceActor = (device: Pick<DeviceRow, 'id' | 'assetTag'>): Actor => ({
  kind: 'device',
  id: device.id,
  label: device.assetTag,
});
