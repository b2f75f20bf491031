using Grpc.Core;
using Halfvoice.Coordination;
using Halfvoice.Wire;
using V1 = Halfvoice.Wire.V1;

namespace Halfvoice.Agent;

/// <summary>
/// Dials the coordinator, feeds the site core what comes in, and does what it says in its order: store, then send. Comes
/// back with growing, jittered waits when the link breaks.
/// </summary>
internal sealed class AgentHost
{
    private readonly SiteSetup _setup;
    private readonly SiteCore _core;
    private readonly SiteLedger _ledger;
    private readonly Serilog.ILogger _log;
    private readonly Backoff _backoff = new();
    private readonly TimeProvider _time;
    private readonly long _started;

    public AgentHost(SiteSetup setup, SiteCore core, SiteLedger ledger, TimeProvider time, Serilog.ILogger log)
    {
        _setup = setup;
        _core = core;
        _ledger = ledger;
        _time = time;
        _started = time.GetTimestamp();
        _log = log;
    }

    /// <summary>A core that breaks its own rules is no lost link: it must end the agent and not be dialled away.</summary>
    private SiteStep Decide(SiteInput input)
    {
        try
        {
            return _core.Step(input, Now);
        }
        catch (InvalidOperationException broken)
        {
            throw new SiteBrokenException("The site's own computation failed; the agent stops and answers nothing.", broken);
        }
    }

    private enum StreamEnd
    {
        LinkLost,
        Farewell,
        RefusedForGood,
    }

    private TimeSpan Now => _time.GetElapsedTime(_started);

    /// <summary>Runs until the coordinator says farewell or a stop is asked for.</summary>
    public async Task<int> RunAsync(V1.Dispatch.DispatchClient client, CancellationToken stop)
    {
        var code = ExitCodes.Done;
        try
        {
            while (!stop.IsCancellationRequested)
            {
                var end = await JoinAsync(client, stop).ConfigureAwait(false);
                if (end == StreamEnd.RefusedForGood)
                    code = ExitCodes.RefusedForGood;
                if (end != StreamEnd.LinkLost)
                    break;
                await Task.Delay(_backoff.Next(), stop).ConfigureAwait(false);
            }
        }
        catch (OperationCanceledException) when (stop.IsCancellationRequested)
        {
            _log.Information("Stopping as asked");
        }

        var step = _core.Step(new SiteInput.Stopping(), Now);
        _ledger.Store(step.Charges, step.SetPoints);
        return code;
    }

    private async Task<StreamEnd> JoinAsync(V1.Dispatch.DispatchClient client, CancellationToken stop)
    {
        var wire = new CoordinatorWire();
        using var call = client.Join(cancellationToken: stop);
        try
        {
            await call.RequestStream.WriteAsync(wire.WriteEnrol(_setup.Site, _core.Enrolment()), stop).ConfigureAwait(false);
            return await ListenAsync(call, wire).ConfigureAwait(false);
        }
        catch (RpcException failure) when (failure.StatusCode == StatusCode.PermissionDenied)
        {
            _log.Error("The coordinator does not admit this site: {Detail}", failure.Status.Detail);
            return StreamEnd.RefusedForGood;
        }
        catch (RpcException) when (stop.IsCancellationRequested)
        {
            throw new OperationCanceledException(stop);
        }
        catch (Exception failure) when (failure is RpcException or IOException or InvalidOperationException)
        {
            _log.Warning("The link to the coordinator broke: {Problem}", failure.Message);
            return StreamEnd.LinkLost;
        }
    }

    /// <summary>Reads until the stream ends. The call itself carries the stop, so that no message pays for registering it again.</summary>
    private async Task<StreamEnd> ListenAsync(
        AsyncDuplexStreamingCall<V1.FromSite, V1.FromCoordinator> call, CoordinatorWire wire)
    {
        while (await call.ResponseStream.MoveNext(CancellationToken.None).ConfigureAwait(false))
        {
            var (message, fault) = wire.Read(call.ResponseStream.Current);
            if (fault is not null)
            {
                _log.Warning("Refused a message of the coordinator: {Reason} {Text}", fault.Reason, fault.Text);
                await call.RequestStream.WriteAsync(wire.WriteRefusal(fault.At(RoundId.None))).ConfigureAwait(false);
                return StreamEnd.LinkLost;
            }

            switch (message)
            {
                case FromCoordinatorMessage.Welcomed welcomed:
                    _backoff.Reset();
                    _log.Information("Joined; next is cycle {Cycle}", welcomed.Welcome.NextCycle);
                    await DoAsync(call, wire, new SiteInput.Welcomed(welcomed.Welcome)).ConfigureAwait(false);
                    break;
                case FromCoordinatorMessage.Asked asked:
                    await DoAsync(call, wire, new SiteInput.Asked(asked.Ask)).ConfigureAwait(false);
                    break;
                case FromCoordinatorMessage.Ended ended:
                    _log.Information("Cycle {Cycle} ended: {End} after {Rounds} rounds", ended.Outcome.Cycle, ended.Outcome.End, ended.Outcome.Rounds);
                    await DoAsync(call, wire, new SiteInput.Ended(ended.Outcome)).ConfigureAwait(false);
                    break;
                case FromCoordinatorMessage.Pulse:
                    await call.RequestStream.WriteAsync(wire.WritePulse()).ConfigureAwait(false);
                    break;
                case FromCoordinatorMessage.Refused refused:
                    _log.Warning("The coordinator refused: {Reason} {Text}", refused.Refusal.Reason, refused.Refusal.Text);
                    if (refused.Refusal.Reason is RefusalReason.NotOurPlan or RefusalReason.WrongIdentity)
                        return StreamEnd.RefusedForGood;
                    break;
                case FromCoordinatorMessage.Farewell farewell:
                    _log.Information("Farewell: {Text}", farewell.Text);
                    await call.RequestStream.CompleteAsync().ConfigureAwait(false);
                    return StreamEnd.Farewell;
                default:
                    break;
            }
        }

        return StreamEnd.LinkLost;
    }

    private async Task DoAsync(
        AsyncDuplexStreamingCall<V1.FromSite, V1.FromCoordinator> call, CoordinatorWire wire, SiteInput input)
    {
        var step = Decide(input);
        _ledger.Store(step.Charges, step.SetPoints);
        switch (step.Reply)
        {
            case SiteReply.Answered answered:
                await call.RequestStream.WriteAsync(wire.WriteAnswer(answered.Answer)).ConfigureAwait(false);
                break;
            case SiteReply.Refused refused:
                _log.Warning("Refused {Round}: {Reason}", refused.Refusal.Id, refused.Refusal.Reason);
                await call.RequestStream.WriteAsync(wire.WriteRefusal(refused.Refusal)).ConfigureAwait(false);
                break;
            default:
                break;
        }

        _core.PrepareNoise();
    }
}
