import type { Scope } from '@/lib/contract/scopes';
import type { Permission } from './permissions';

interface Access {
  /** A signed-in person with this permission. */
  permission?: Permission;
  /** Anybody. */
  public?: true;
  /** A device with its credential. */
  device?: true;
  /** Another system whose token has this scope. */
  client?: Scope;
  /** Reachable without the second factor that one's role demands, because it is where one sets it up. */
  beforeSecondFactor?: true;
}

/** Every page and route of the house and who may reach it. What is not in here does not compile, and a test compares. */
export const ROUTES = {
  'PAGE /': { public: true },
  'PAGE /sign-in': { public: true },
  'PAGE /forgot': { public: true },
  'PAGE /reset/[token]': { public: true },
  'PAGE /invite/[token]': { public: true },
  'PAGE /problems': { public: true },
  'PAGE /problems/[type]': { public: true },
  'PAGE /device-api': { public: true },
  'PAGE /account': { permission: 'self', beforeSecondFactor: true },
  'PAGE /bench': { permission: 'fleet.read' },
  'PAGE /bench/add': { permission: 'fleet.write' },
  'PAGE /bench/models': { permission: 'model.read' },
  'PAGE /devices/[id]': { permission: 'device.read' },
  'PAGE /devices/[id]/sheet': { permission: 'fleet.write' },
  'PAGE /bedside': { permission: 'bedside.read' },
  'PAGE /bedside/recordings': { permission: 'bedside.read' },
  'PAGE /bedside/tray': { permission: 'bedside.read' },
  'PAGE /bedside/sessions/new': { permission: 'session.write' },
  'PAGE /bedside/sessions/[id]': { permission: 'bedside.read' },
  'PAGE /encounters/[id]': { permission: 'bedside.read' },
  'PAGE /recordings/[id]': { permission: 'recording.read' },
  'PAGE /keyroom': { permission: 'credential.read' },
  'PAGE /keyroom/people': { permission: 'people.read' },
  'PAGE /keyroom/people/[id]': { permission: 'people.read' },
  'PAGE /keyroom/people/invitations': { permission: 'people.read' },
  'PAGE /keyroom/rotations': { permission: 'credential.read' },
  'PAGE /keyroom/rotations/[id]': { permission: 'credential.read' },
  'PAGE /keyroom/keys': { permission: 'credential.read' },
  'PAGE /keyroom/policies': { permission: 'policy.read' },
  'PAGE /keyroom/policies/[kind]': { permission: 'policy.read' },
  'PAGE /keyroom/connections': { permission: 'connections.read' },
  'PAGE /keyroom/clients': { permission: 'connections.read' },
  'PAGE /keyroom/webhooks': { permission: 'connections.read' },
  'PAGE /keyroom/webhooks/[id]': { permission: 'connections.read' },
  'PAGE /keyroom/health': { permission: 'health.read' },
  'PAGE /ledger': { permission: 'thread.read' },
  'PAGE /ledger/[kind]/[id]': { permission: 'thread.read' },
  'PAGE /ledger/recordings/[number]': { permission: 'thread.read' },
  'PAGE /ledger/heads': { permission: 'ledger.read' },

  'GET /.well-known/jwks.json': { public: true },
  'GET /.well-known/custody-keys.txt': { public: true },
  'GET /api/health': { public: true },
  'POST /api/auth/sign-in': { public: true },
  'POST /api/auth/authenticator': { public: true },
  'POST /api/auth/recovery-code': { public: true },
  'POST /api/auth/forgot': { public: true },
  'POST /api/auth/reset': { public: true },
  'POST /api/auth/passkey/options': { public: true },
  'POST /api/auth/passkey': { public: true },
  'GET /api/auth/single-sign-on': { public: true },
  'GET /api/auth/single-sign-on/callback': { public: true },
  'POST /api/invitations/accept': { public: true },

  'GET /api/device/v1/openapi.json': { public: true },
  'POST /api/device/v1/enrol': { public: true },
  'POST /api/device/v1/token': { device: true },
  'POST /api/device/v1/heartbeat': { device: true },
  'POST /api/device/v1/recordings': { device: true },
  'POST /api/device/v1/recordings/[id]/complete': { device: true },

  'POST /api/v1/token': { public: true },
  'GET /api/v1/recordings': { client: 'recordings.read' },
  'GET /api/v1/devices': { client: 'devices.read' },
  'GET /api/v1/ledger': { client: 'ledger.read' },

  'GET /api/events': { permission: 'self' },
  'GET /api/search': { permission: 'self' },

  'GET /api/devices': { permission: 'fleet.read' },
  'POST /api/devices': { permission: 'fleet.write' },
  'GET /api/devices/csv': { permission: 'fleet.read' },
  'GET /api/devices/pick': { permission: 'session.write' },
  'POST /api/devices/[id]/state': { permission: 'fleet.write' },
  'POST /api/devices/[id]/code': { permission: 'fleet.write' },
  'POST /api/models': { permission: 'model.write' },

  'GET /api/encounters': { permission: 'bedside.read' },
  'GET /api/encounters/[id]': { permission: 'bedside.read' },
  'POST /api/patients/reason': { permission: 'bedside.read' },
  'POST /api/sessions': { permission: 'session.write' },
  'GET /api/sessions/[id]': { permission: 'bedside.read' },
  'POST /api/sessions/[id]/close': { permission: 'session.write' },
  'GET /api/tray': { permission: 'bedside.read' },
  'GET /api/recordings': { permission: 'bedside.read' },
  'GET /api/recordings/[id]': { permission: 'recording.read' },
  'POST /api/recordings/[id]/file': { permission: 'filing.write' },
  'POST /api/recordings/[id]/move': { permission: 'filing.write' },
  'POST /api/recordings/[id]/keep': { permission: 'recording.keep' },
  'POST /api/recordings/[id]/heard': { permission: 'recording.read' },
  'GET /api/recordings/[id]/original': { permission: 'recording.read' },
  'GET /api/recordings/[id]/sound': { permission: 'recording.read' },
  'GET /api/recordings/[id]/peaks': { permission: 'recording.read' },
  'GET /api/recordings/[id]/spectrogram': { permission: 'recording.read' },

  'GET /api/ledger/heads': { permission: 'thread.read' },
  'GET /api/ledger/heads/[size]/locked': { permission: 'thread.read' },
  'GET /api/ledger/recordings/[number]/original': { permission: 'recording.read' },
  'POST /api/ledger/recordings/[number]/evidence': { permission: 'evidence.make' },
  'GET /api/ledger/evidence/[id]': { permission: 'evidence.make' },
  'POST /api/ledger/evidence/[id]/decide': { permission: 'evidence.make' },
  'GET /api/ledger/proofs/inclusion': { permission: 'thread.read' },
  'GET /api/ledger/proofs/consistency': { permission: 'thread.read' },

  'GET /api/rotations': { permission: 'credential.read' },
  'POST /api/rotations': { permission: 'credential.write' },
  'POST /api/rotations/count': { permission: 'credential.write' },
  'GET /api/rotations/[id]': { permission: 'credential.read' },
  'POST /api/rotations/[id]/steer': { permission: 'credential.write' },
  'GET /api/signing-keys': { permission: 'credential.read' },
  'POST /api/signing-keys/rotate': { permission: 'credential.write' },
  'POST /api/signing-keys/distrust': { permission: 'credential.write' },
  'GET /api/devices/[id]/lost': { permission: 'device.lost' },
  'POST /api/devices/[id]/lost': { permission: 'device.lost' },
  'GET /api/credentials': { permission: 'credential.read' },
  'POST /api/credentials/[id]/rotate': { permission: 'credential.write' },
  'POST /api/credentials/[id]/revoke': { permission: 'credential.write' },

  'POST /api/policies/[kind]': { permission: 'policy.write' },
  'POST /api/policies/[kind]/preview': { permission: 'policy.write' },

  'POST /api/connections/[kind]': { permission: 'connections.write' },
  'POST /api/connections/[kind]/test': { permission: 'connections.write' },

  'GET /api/clients': { permission: 'connections.read' },
  'POST /api/clients': { permission: 'connections.write' },
  'POST /api/clients/[id]/rotate': { permission: 'connections.write' },
  'POST /api/clients/[id]/revoke': { permission: 'connections.write' },

  'POST /api/webhooks': { permission: 'connections.write' },
  'POST /api/webhooks/[id]/test': { permission: 'connections.write' },
  'POST /api/webhooks/[id]/pause': { permission: 'connections.write' },
  'POST /api/webhooks/[id]/rotate': { permission: 'connections.write' },
  'POST /api/webhooks/[id]/remove': { permission: 'connections.write' },
  'POST /api/webhooks/deliveries/[id]/repeat': { permission: 'connections.write' },

  'GET /api/me': { permission: 'self', beforeSecondFactor: true },
  'POST /api/account/sign-out': { permission: 'self', beforeSecondFactor: true },
  'GET /api/account/sessions': { permission: 'self', beforeSecondFactor: true },
  'POST /api/account/sessions/end': { permission: 'self', beforeSecondFactor: true },
  'POST /api/account/password': { permission: 'self', beforeSecondFactor: true },
  'POST /api/account/second-factor': { permission: 'self', beforeSecondFactor: true },
  'POST /api/account/second-factor/confirm': { permission: 'self', beforeSecondFactor: true },
  'POST /api/account/second-factor/remove': { permission: 'self' },
  'POST /api/account/recovery-codes': { permission: 'self' },
  'POST /api/account/passkeys/options': { permission: 'self', beforeSecondFactor: true },
  'POST /api/account/passkeys': { permission: 'self', beforeSecondFactor: true },
  'POST /api/account/passkeys/[id]/remove': { permission: 'self' },

  'GET /api/people': { permission: 'people.read' },
  'GET /api/people/[id]': { permission: 'people.read' },
  'POST /api/people/[id]/roles': { permission: 'people.write' },
  'POST /api/people/[id]/wards': { permission: 'people.write' },
  'POST /api/people/[id]/end-sessions': { permission: 'people.write' },
  'POST /api/people/[id]/remove-second-factor': { permission: 'people.write' },
  'POST /api/people/[id]/leave': { permission: 'people.write' },
  'GET /api/invitations': { permission: 'people.read' },
  'POST /api/invitations': { permission: 'people.write' },
  'POST /api/invitations/[id]/send-again': { permission: 'people.write' },
  'POST /api/invitations/[id]/withdraw': { permission: 'people.write' },
} as const satisfies Record<string, Access>;

export type RouteKey = keyof typeof ROUTES;

/** The permission that a route or page asks for; `never` for public and device ones. */
export type PermissionOf<K extends RouteKey> = (typeof ROUTES)[K] extends {
  permission: infer P extends Permission;
}
  ? P
  : never;

/** Keys of routes that people reach. */
export type PersonRouteKey = { [K in RouteKey]: PermissionOf<K> extends never ? never : K }[RouteKey];

/** Keys of routes that anybody reaches. */
export type PublicRouteKey = {
  [K in RouteKey]: (typeof ROUTES)[K] extends { public: true } ? K : never;
}[RouteKey];

/** The scope that a route of other systems asks for; `never` for the rest. */
export type ScopeOf<K extends RouteKey> = (typeof ROUTES)[K] extends { client: infer S extends Scope }
  ? S
  : never;

/** Keys of routes that other systems reach with a token of their own. */
export type ClientRouteKey = { [K in RouteKey]: ScopeOf<K> extends never ? never : K }[RouteKey];

export const accessOf = (key: RouteKey): Access => ROUTES[key];
