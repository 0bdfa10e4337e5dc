import { index, integer, primaryKey, sqliteTable, text, uniqueIndex } from 'drizzle-orm/sqlite-core';
import { at, hash } from './columns';

const stamp = (name: string) => integer(name, { mode: 'timestamp_ms' });

/** People. The table names and columns of this first group are Better Auth's. */
export const user = sqliteTable('user', {
  id: text('id').primaryKey(),
  name: text('name').notNull(),
  email: text('email').notNull().unique(),
  emailVerified: integer('email_verified', { mode: 'boolean' }).notNull().default(false),
  image: text('image'),
  createdAt: stamp('created_at').notNull(),
  updatedAt: stamp('updated_at').notNull(),
  twoFactorEnabled: integer('two_factor_enabled', { mode: 'boolean' }).default(false),
  /** What a person does, in words, for the plate: "Respiratory medicine". */
  jobTitle: text('job_title'),
  /** Set when a person left: may not sign in, and stays named in everything they did. */
  leftAt: at('left_at'),
  lastSignedInAt: at('last_signed_in_at'),
});

export const session = sqliteTable(
  'session',
  {
    id: text('id').primaryKey(),
    expiresAt: stamp('expires_at').notNull(),
    token: text('token').notNull().unique(),
    createdAt: stamp('created_at').notNull(),
    updatedAt: stamp('updated_at').notNull(),
    ipAddress: text('ip_address'),
    userAgent: text('user_agent'),
    userId: text('user_id')
      .notNull()
      .references(() => user.id, { onDelete: 'cascade' }),
  },
  (t) => [index('session_by_user').on(t.userId)],
);

export const account = sqliteTable(
  'account',
  {
    id: text('id').primaryKey(),
    accountId: text('account_id').notNull(),
    providerId: text('provider_id').notNull(),
    userId: text('user_id')
      .notNull()
      .references(() => user.id, { onDelete: 'cascade' }),
    accessToken: text('access_token'),
    refreshToken: text('refresh_token'),
    idToken: text('id_token'),
    accessTokenExpiresAt: stamp('access_token_expires_at'),
    refreshTokenExpiresAt: stamp('refresh_token_expires_at'),
    scope: text('scope'),
    password: text('password'),
    createdAt: stamp('created_at').notNull(),
    updatedAt: stamp('updated_at').notNull(),
  },
  (t) => [index('account_by_user').on(t.userId)],
);

export const verification = sqliteTable(
  'verification',
  {
    id: text('id').primaryKey(),
    identifier: text('identifier').notNull(),
    value: text('value').notNull(),
    expiresAt: stamp('expires_at').notNull(),
    createdAt: stamp('created_at').notNull(),
    updatedAt: stamp('updated_at').notNull(),
  },
  (t) => [index('verification_by_identifier').on(t.identifier)],
);

export const twoFactor = sqliteTable(
  'two_factor',
  {
    id: text('id').primaryKey(),
    secret: text('secret').notNull(),
    backupCodes: text('backup_codes').notNull(),
    userId: text('user_id')
      .notNull()
      .references(() => user.id, { onDelete: 'cascade' }),
    verified: integer('verified', { mode: 'boolean' }).default(true),
    failedVerificationCount: integer('failed_verification_count').default(0),
    lockedUntil: stamp('locked_until'),
  },
  (t) => [index('two_factor_by_user').on(t.userId)],
);

export const rateLimit = sqliteTable('rate_limit', {
  id: text('id').primaryKey(),
  key: text('key').notNull().unique(),
  count: integer('count').notNull(),
  lastRequest: integer('last_request').notNull(),
});

/** Wrong passwords and what one has to wait for them. The key is an HMAC: nobody's mistyped address is kept. */
export const signInTry = sqliteTable(
  'sign_in_try',
  {
    key: text('key').primaryKey(),
    wrong: integer('wrong').notNull(),
    lastAt: at('last_at').notNull(),
    waitUntil: at('wait_until').notNull(),
  },
  (t) => [index('sign_in_try_by_time').on(t.lastAt)],
);

/** What works once: second-factor codes that were entered (RFC 6238, 5.2). The key is an HMAC. */
export const usedCode = sqliteTable(
  'used_code',
  { key: text('key').primaryKey(), expiresAt: at('expires_at').notNull() },
  (t) => [index('used_code_by_end').on(t.expiresAt)],
);

/** A way to a new password that was sent by mail. */
export const passwordReset = sqliteTable(
  'password_reset',
  {
    /** SHA-256 of the token in the mail, hex. */
    tokenHash: text('token_hash').primaryKey(),
    personId: text('person_id')
      .notNull()
      .references(() => user.id),
    createdAt: at('created_at').notNull(),
    expiresAt: at('expires_at').notNull(),
    usedAt: at('used_at'),
  },
  (t) => [index('password_reset_by_person').on(t.personId)],
);

/** A key of a person's own device or security key (WebAuthn, level 3). */
export const passkey = sqliteTable(
  'passkey',
  {
    /** Credential id, base64url. */
    id: text('id').primaryKey(),
    personId: text('person_id')
      .notNull()
      .references(() => user.id),
    name: text('name').notNull(),
    /** COSE key (RFC 9052). */
    publicKey: hash('public_key').notNull(),
    counter: integer('counter').notNull(),
    /** Comma-separated hints of how the browser reaches it. */
    transports: text('transports').notNull(),
    /** Copied to other devices of its holder by whoever made it. */
    backedUp: integer('backed_up', { mode: 'boolean' }).notNull(),
    createdAt: at('created_at').notNull(),
    lastUsedAt: at('last_used_at'),
  },
  (t) => [index('passkey_by_person').on(t.personId)],
);

/** What is under way at a browser and works once: a challenge to a passkey, a way through single sign-on. */
export const signInAttempt = sqliteTable(
  'sign_in_attempt',
  {
    /** SHA-256 of the handle that the browser holds, hex. */
    keyHash: text('key_hash').primaryKey(),
    purpose: text('purpose', { enum: ['passkey-add', 'passkey-sign-in', 'single-sign-on'] }).notNull(),
    personId: text('person_id'),
    /** Sealed: challenge, nonce, code verifier. */
    sealedState: text('sealed_state').notNull(),
    expiresAt: at('expires_at').notNull(),
  },
  (t) => [index('sign_in_attempt_by_end').on(t.expiresAt)],
);

/** Roles are ours: a person may hold several. */
export const personRole = sqliteTable(
  'person_role',
  {
    personId: text('person_id')
      .notNull()
      .references(() => user.id),
    role: text('role', { enum: ['biomed', 'clinician', 'itadmin', 'auditor'] }).notNull(),
    givenBy: text('given_by'),
    givenAt: at('given_at').notNull(),
  },
  (t) => [primaryKey({ columns: [t.personId, t.role] })],
);

export const invitation = sqliteTable(
  'invitation',
  {
    id: text('id').primaryKey(),
    email: text('email').notNull(),
    name: text('name').notNull(),
    /** Comma-separated role ids; wards as ward ids. Both small and read whole. */
    roles: text('roles').notNull(),
    wardIds: text('ward_ids').notNull().default(''),
    jobTitle: text('job_title'),
    /** SHA-256 of the token in the mail, hex. */
    tokenHash: text('token_hash').notNull(),
    invitedBy: text('invited_by')
      .notNull()
      .references(() => user.id),
    createdAt: at('created_at').notNull(),
    expiresAt: at('expires_at').notNull(),
    acceptedAt: at('accepted_at'),
    withdrawnAt: at('withdrawn_at'),
  },
  (t) => [uniqueIndex('invitation_by_token').on(t.tokenHash), index('invitation_by_email').on(t.email)],
);
