/** Hands a text to the person as a file. */
export function download(name: string, text: string): void {
	const url = URL.createObjectURL(new Blob([text], { type: 'application/json' }));
	const link = document.createElement('a');
	link.href = url;
	link.download = name;
	link.click();
	// The browser has its own hold on it by then.
	setTimeout(() => {
		URL.revokeObjectURL(url);
	}, 60_000);
}
