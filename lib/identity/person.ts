export type { Authorized, Person } from '@/lib/platform/authority';
