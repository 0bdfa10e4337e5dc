/** What the audit can find, by stable codes, and what each means. DEVELOPERS.md lists the same. */
export const AUDIT_CODES = {
  'entry-edited': 'An entry is not the one that was hashed or signed.',
  'entry-removed': 'An entry that was there is gone, and the log goes on after it.',
  'entry-inserted': 'An entry was put in where another already stood.',
  'entry-moved': 'An entry does not stand where its own number says.',
  'entry-unreadable': 'An entry is no canonical JSON.',
  'columns-changed': 'What is searched by (time, kind, actor) is not what the entry says.',
  'thread-changed': 'An entry was taken out of a thread or put into one it does not speak of.',
  'clock-set-back': 'An entry is dated well before the one in front of it.',
  'tail-cut': 'The log ends before a head that this database itself holds.',
  'subtree-changed': 'A stored subtree is not the hash of its entries.',
  'subtree-missing': 'A stored subtree is not there.',
  'tree-differs': 'The tree is not the one of a head, and entries before it are named above.',
  'tree-replaced': 'The tree was made anew: whole in itself, and not the one that was signed.',
  'database-restored':
    'The database is an older copy of itself: storage or mail hold heads that it does not know.',
  'head-replaced': 'A head in the database is not the one that is kept in storage or mail.',
  'head-removed': 'A head that is kept in storage or mail is not in the database any more.',
  'head-unsigned': 'A head is not signed by a key of this log.',
  'head-unreadable': 'What is kept as a head is none.',
  'head-not-stored': 'A head of the database is not in storage.',
  'head-unlocked': 'A head in storage is not locked.',
  'recording-changed': 'A recording’s row does not say what its sealed entry says.',
  'recording-without-entry': 'A recording is sealed and no entry says so.',
  'original-missing': 'The original is not in storage.',
  'original-altered': 'The original is not the bytes that were sealed.',
  'original-unlocked': 'The original is not locked as its entry says.',
  'derived-missing': 'A picture is not in storage, or its row is gone.',
  'derived-altered': 'A picture is not the bytes that were made.',
  'derived-changed': 'A picture’s row does not say what was measured, or of which original.',
  'verdict-changed': 'The verdict is not the one that was measured.',
} as const;
export type AuditCode = keyof typeof AUDIT_CODES;

export interface Finding {
  code: AuditCode;
  /** Sequence number of the (first) entry it is about. */
  sequence?: number;
  /** Number of the recording it is about. */
  recording?: string;
  /** Size of the head's tree. */
  size?: number;
  /** Key in storage. */
  key?: string;
  detail: string;
}

/** Where findings go, in the order they are made. */
export type Report = (finding: Finding) => void;
