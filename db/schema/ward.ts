import { index, primaryKey, sqliteTable, text } from 'drizzle-orm/sqlite-core';
import { at, id } from './columns';
import { user } from './identity';

export const ward = sqliteTable('ward', {
  id: id(),
  name: text('name').notNull().unique(),
  createdAt: at('created_at').notNull(),
});

/** The wards a person works on. */
export const personWard = sqliteTable(
  'person_ward',
  {
    personId: text('person_id')
      .notNull()
      .references(() => user.id),
    wardId: text('ward_id')
      .notNull()
      .references(() => ward.id),
  },
  (t) => [primaryKey({ columns: [t.personId, t.wardId] }), index('person_ward_by_ward').on(t.wardId)],
);
