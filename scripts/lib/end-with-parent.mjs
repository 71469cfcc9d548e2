// Preloaded into the server: when the command that started it is gone, however it went, the server ends in good order
// instead of holding its port for ever.
if (process.channel) {
	process.on('disconnect', () => process.kill(process.pid, 'SIGTERM'));
	// The channel alone must not keep a server alive that has finished.
	process.channel.unref();
}
