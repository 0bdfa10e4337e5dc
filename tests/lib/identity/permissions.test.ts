import { describe, expect, test } from 'vitest';
import { may, PERMISSIONS, type Permission, ROLES, ROOMS, type Role } from '@/lib/identity/permissions';

/**
 * Who may do what, written down a second time and by hand: what each person must get done in their room, and nothing
 * of the others'. A change of the table is a decision, and is made in both places.
 */
const MAY: Record<Role, Permission[]> = {
  biomed: [
    'device.lost',
    'device.read',
    'fleet.read',
    'fleet.write',
    'model.read',
    'model.write',
    'policy.read',
    'self',
    'thread.read',
  ],
  clinician: [
    'bedside.read',
    'device.read',
    'filing.write',
    'reading.write',
    'recording.keep',
    'recording.read',
    'self',
    'session.write',
    'thread.read',
  ],
  itadmin: [
    'connections.read',
    'connections.write',
    'credential.read',
    'credential.write',
    'device.lost',
    'device.read',
    'fleet.read',
    'health.read',
    'model.read',
    'people.read',
    'people.write',
    'policy.read',
    'policy.write',
    'self',
    'thread.read',
  ],
  auditor: [
    'device.read',
    'evidence.make',
    'ledger.read',
    'policy.read',
    'recording.read',
    'self',
    'thread.read',
  ],
};

describe('the table of permissions', () => {
  test.each(ROLES)('gives %s what is written here', (role) => {
    const held = (Object.keys(PERMISSIONS) as Permission[]).filter((permission) => may([role], permission));
    expect(held.sort()).toEqual(MAY[role]);
  });

  test('lets nobody who looks after machines or people see a patient’s recording', () => {
    for (const role of ['biomed', 'itadmin'] as const) {
      expect(may([role], 'recording.read')).toBe(false);
      expect(may([role], 'bedside.read')).toBe(false);
      expect(may([role], 'ledger.read')).toBe(false);
    }
  });

  test('lets the auditor change nothing', () => {
    for (const permission of MAY.auditor) expect(permission).not.toMatch(/\.(write|keep)$/);
  });

  test('gives somebody with two roles what either may do', () => {
    expect(may(['auditor', 'biomed'], 'fleet.write')).toBe(true);
    expect(may(['auditor', 'biomed'], 'people.write')).toBe(false);
    expect(may([], 'self')).toBe(false);
  });

  test('has a room for every role', () => {
    const rooms = (role: Role) => ROOMS.filter((room) => may([role], room.permission)).map(({ id }) => id);
    expect(rooms('biomed')).toContain('bench');
    expect(rooms('clinician')).toContain('bedside');
    expect(rooms('itadmin')).toContain('keyroom');
    expect(rooms('auditor')).toEqual(['ledger']);
  });
});
