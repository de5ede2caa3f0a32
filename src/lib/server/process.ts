import type { IncomingMessage } from 'node:http';
import type { Logger } from 'pino';
import type { Config } from './config';

type Hook = () => void | Promise<void>;

/**
 * What the server script (src/bin/server.js) and the built app share. They are separate bundles, so
 * a module imported by both would exist twice; this object hangs on globalThis instead and exists
 * once in the process.
 */
export interface TallybarProcess {
	config?: Config;
	log?: Logger;
	/** True from the first stop signal on. */
	draining: boolean;
	/** Run at the first stop signal, while requests are still being answered. */
	whenDraining: Set<Hook>;
	/** Run after the last request has ended, in order. */
	whenDrained: Set<Hook>;
	/** Which route answered a request: the log names routes, never addresses that may hold a token. */
	routes: WeakMap<IncomingMessage, string>;
}

const KEY = Symbol.for('tallybar.process');

export function tallybarProcess(): TallybarProcess {
	const holder = globalThis as { [KEY]?: TallybarProcess };
	return (holder[KEY] ??= {
		draining: false,
		whenDraining: new Set(),
		whenDrained: new Set(),
		routes: new WeakMap()
	});
}

/**
 * Runs `hook` as soon as the server is asked to stop: for what would never end by itself, such as
 * an event stream. Returns the function that forgets the hook; an ended stream must call it, or it
 * is kept for the life of the process.
 */
export function whenDraining(hook: Hook): () => void {
	const { whenDraining: hooks } = tallybarProcess();
	hooks.add(hook);
	return () => hooks.delete(hook);
}

/** Runs `hook` after the last request has ended: for what requests stand on, such as the database. */
export function whenDrained(hook: Hook): () => void {
	const { whenDrained: hooks } = tallybarProcess();
	hooks.add(hook);
	return () => hooks.delete(hook);
}
