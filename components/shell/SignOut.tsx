export type SignOutAction = string | ((data: FormData) => void | Promise<void>);

/** Works without scripts too: a form that posts. */
export function SignOut({ action }: { action: SignOutAction }) {
  return (
    <form action={action} {...(typeof action === 'string' ? { method: 'post' } : {})}>
      <button type="submit" className="link">
        Sign out
      </button>
    </form>
  );
}
