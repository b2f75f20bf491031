using Halfvoice.Rig.Commands;

return await RigCommandLine.RunAsync(args).ConfigureAwait(false);
