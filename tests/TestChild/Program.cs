using Halfvoice.Tests.Child;

// The test child plays a process of a rehearsal ("child") or a rig that owns some ("parent"); see the two classes.
return args switch
{
    ["child", .. var options] => PlayedChild.Run(options),
    ["parent", var count, var witness, .. var options] => await PlayedParent.RunAsync(int.Parse(count), witness, options),
    _ => 64,
};
