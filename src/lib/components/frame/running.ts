/**
 * The session of this tab, with its store and its sync: one, from whichever page needs it first until the tab is left.
 * Whoever goes from the bench to a page of the server goes on sending. It is the root layout's, and is handed what makes
 * a session instead of naming it: the pages that sign somebody in must not load the device code.
 */
import type { Session } from '$lib/device/session.svelte';

export class Running {
	#session: Session | undefined;

	/** The session there is, or a new one. It asks the server anew either way: who is signed in may have changed. */
	begin(make: () => Session): Session {
		if (this.#session) void this.#session.check();
		else {
			this.#session = make();
			void this.#session.start();
		}
		return this.#session;
	}

	stop(): void {
		this.#session?.stop();
		this.#session = undefined;
	}
}
