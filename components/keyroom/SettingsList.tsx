/** What is in force, label and value side by side; the label gives way where there is little room. */
export function SettingsList({ rows }: { rows: readonly { name: string; label: string; value: string }[] }) {
  return (
    <dl className="grid grid-cols-[minmax(0,1fr)_max-content] gap-x-4 gap-y-2">
      {rows.map(({ name, label, value }) => (
        <div key={name} className="contents">
          <dt className="text-ink-soft">{label}</dt>
          <dd>{value}</dd>
        </div>
      ))}
    </dl>
  );
}
