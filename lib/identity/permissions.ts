/**
 * Who may do what: the one table that every page, action and route asks. Safe in a browser: it decides what is
 * shown there, never what is allowed.
 */
export const ROLES = ['biomed', 'clinician', 'itadmin', 'auditor'] as const;
export type Role = (typeof ROLES)[number];

export const ROLE_NAMES: Record<Role, string> = {
  biomed: 'Biomedical engineer',
  clinician: 'Clinician',
  itadmin: 'IT administrator',
  auditor: 'Auditor',
};

export const PERMISSIONS = {
  /** Anybody who is signed in: their own account, search box, live events. */
  self: ['biomed', 'clinician', 'itadmin', 'auditor'],
  'fleet.read': ['biomed', 'itadmin'],
  'fleet.write': ['biomed'],
  /** Device pages, reached from a recording or a thread too. */
  'device.read': ['biomed', 'itadmin', 'auditor', 'clinician'],
  /** Report a device lost: whoever hears of it first. */
  'device.lost': ['biomed', 'itadmin'],
  'model.read': ['biomed', 'itadmin'],
  'model.write': ['biomed'],
  'bedside.read': ['clinician'],
  'session.write': ['clinician'],
  'filing.write': ['clinician'],
  /** A recording with its patient: the clinician's wards, or the auditor's look. */
  'recording.read': ['clinician', 'auditor'],
  'recording.keep': ['clinician'],
  'reading.write': ['clinician'],
  'credential.read': ['itadmin'],
  'credential.write': ['itadmin'],
  'people.read': ['itadmin'],
  'people.write': ['itadmin'],
  'connections.read': ['itadmin'],
  'connections.write': ['itadmin'],
  'policy.read': ['itadmin', 'auditor', 'biomed'],
  'policy.write': ['itadmin'],
  'health.read': ['itadmin'],
  /** The whole ledger. */
  'ledger.read': ['auditor'],
  /** Evidence packages: ask, decide what somebody else asked, take away. */
  'evidence.make': ['auditor'],
  /** The custody thread of what one may see anyway. */
  'thread.read': ['auditor', 'clinician', 'itadmin', 'biomed'],
} as const satisfies Record<string, readonly Role[]>;

export type Permission = keyof typeof PERMISSIONS;

export const may = (roles: readonly Role[], permission: Permission): boolean =>
  roles.some((role) => (PERMISSIONS[permission] as readonly Role[]).includes(role));

/** The rooms a person may enter, in the order of the plate. */
export const ROOMS = [
  { id: 'bench', name: 'Bench', href: '/bench', permission: 'fleet.read' },
  { id: 'bedside', name: 'Bedside', href: '/bedside', permission: 'bedside.read' },
  { id: 'keyroom', name: 'Key room', href: '/keyroom', permission: 'credential.read' },
  { id: 'ledger', name: 'Ledger', href: '/ledger', permission: 'thread.read' },
] as const satisfies { id: string; name: string; href: string; permission: Permission }[];
