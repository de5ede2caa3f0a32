/**
 * A double tap on a key writes once: while `act` runs, calling it again does nothing. Gloves and mice bounce, and a
 * form sent twice would plan two of everything.
 */
export function once<A extends readonly unknown[]>(
	act: (...args: A) => Promise<void>
): (...args: A) => Promise<void> {
	let running = false;
	return async (...args) => {
		// Whether it runs or not: the browser must not send the form to the server by itself.
		for (const arg of args) if (arg instanceof Event) arg.preventDefault();
		if (running) return;
		running = true;
		try {
			await act(...args);
		} finally {
			running = false;
		}
	};
}
