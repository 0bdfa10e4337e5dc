import type { Presence } from './person';

export function PersonLines({ person, hospital }: Pick<Presence, 'person' | 'hospital'>) {
  return (
    <div className="min-w-0 break-words">
      <p className="text-ink">{person.name}</p>
      {person.jobTitle ? <p>{person.jobTitle}</p> : null}
      <p className="mt-2">{hospital}</p>
    </div>
  );
}
