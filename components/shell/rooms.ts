import { may, ROOMS, type Role } from '@/lib/identity/permissions';

export type Room = (typeof ROOMS)[number];

export const roomsOf = (roles: readonly Role[]): Room[] =>
  ROOMS.filter((room) => may(roles, room.permission));

/** Pages that several rooms share, and whose they are first. */
const SHARED: readonly { prefix: string; rooms: readonly Room['id'][] }[] = [
  { prefix: '/devices', rooms: ['bench', 'keyroom', 'bedside', 'ledger'] },
  { prefix: '/recordings', rooms: ['bedside', 'ledger'] },
  { prefix: '/encounters', rooms: ['bedside', 'ledger'] },
  { prefix: '/patients', rooms: ['bedside', 'ledger'] },
];

const under = (pathname: string, prefix: string) => pathname === prefix || pathname.startsWith(`${prefix}/`);

/** The room that a page stands in, for somebody who may enter these rooms. */
export function currentRoom(pathname: string, rooms: readonly Room[]): Room | undefined {
  const own = rooms.find((room) => under(pathname, room.href));
  if (own) return own;
  const shared = SHARED.find(({ prefix }) => under(pathname, prefix));
  for (const id of shared?.rooms ?? []) {
    const room = rooms.find((one) => one.id === id);
    if (room) return room;
  }
  return undefined;
}
