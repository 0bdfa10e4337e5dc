/** Runs once in each web process before it answers: the database is brought up to date and background work starts. */
export async function register(): Promise<void> {
  if (process.env.NEXT_RUNTIME !== 'nodejs') return;
  const { startProcess } = await import('./lib/http/startProcess');
  await startProcess();
}
