/**
 * Lines beside the log, held or in quarantine, by id and hash: other bytes under one id are other lines here. Were one
 * kept per id, whoever knows an id could put bytes of their own in the place of a line that the server has acknowledged
 * or the owner was shown.
 */
export class Aside<T extends { readonly id: string; readonly hash: string }> {
	readonly #byId = new Map<string, Map<string, T>>();
	readonly #changed = new Map<string, readonly [id: string, hash: string]>();
	readonly #whenMoved: (before: T | undefined, now: T | undefined) => void;

	/** @param whenMoved hears of every line that comes, changes or goes */
	constructor(whenMoved: (before: T | undefined, now: T | undefined) => void = () => undefined) {
		this.#whenMoved = whenMoved;
	}

	/** As the database has it; what this transaction already changed is not read over. */
	load(line: T): void {
		if (!this.#changed.has(`${line.id} ${line.hash}`)) this.#put(line);
	}
	get(id: string, hash: string): T | undefined {
		return this.#byId.get(id)?.get(hash);
	}
	under(id: string): T[] {
		return [...(this.#byId.get(id)?.values() ?? [])];
	}
	all(): T[] {
		return [...this.#byId.values()].flatMap((lines) => [...lines.values()]);
	}
	set(line: T): void {
		this.#put(line);
		this.#changed.set(`${line.id} ${line.hash}`, [line.id, line.hash]);
	}
	delete(id: string, hash: string): void {
		const before = this.get(id, hash);
		if (!before) return;
		this.#byId.get(id)?.delete(hash);
		this.#changed.set(`${id} ${hash}`, [id, hash]);
		this.#whenMoved(before, undefined);
	}
	/** Id and hash of what must be written, or deleted where there is no line any more. */
	get changed(): (readonly [id: string, hash: string])[] {
		return [...this.#changed.values()];
	}

	#put(line: T): void {
		const lines = this.#byId.get(line.id);
		const before = lines?.get(line.hash);
		if (lines) lines.set(line.hash, line);
		else this.#byId.set(line.id, new Map([[line.hash, line]]));
		this.#whenMoved(before, line);
	}
}
