using System.Text.Json;
using Halfvoice.Coordination;

namespace Halfvoice.Coordinator;

/// <summary>
/// Progress as JSON lines on standard output, for the rig and for log collectors. Rounds are thinned to a few lines a
/// second; cycles are always told.
/// </summary>
internal sealed class ProgressLines : IDisposable
{
    private static readonly TimeSpan RoundSpacing = TimeSpan.FromMilliseconds(100);

    private readonly Stream _output;
    private readonly CoordinatorSetup _setup;
    private readonly MemoryStream _buffer = new();
    private TimeSpan _nextRound;

    public ProgressLines(Stream output, CoordinatorSetup setup)
    {
        _output = output;
        _setup = setup;
    }

    /// <summary>Says that the coordinator listens.</summary>
    public void Ready(string address, int port) => Line("ready", json =>
    {
        json.WriteString("address", address);
        json.WriteNumber("port", port);
    });

    public void Finished() => Line("finished", _ => { });

    public void Tell(CoordinatorNews news, TimeSpan now)
    {
        switch (news)
        {
            case CoordinatorNews.Gathering gathering:
                Line("gathering", json =>
                {
                    json.WriteNumber("joined", gathering.Joined);
                    json.WriteNumber("sites", gathering.Sites);
                });
                break;
            case CoordinatorNews.CycleBegan began:
                Line("cycle_began", json => json.WriteNumber("cycle", began.Cycle));
                break;
            case CoordinatorNews.RoundDone done when now >= _nextRound:
                _nextRound = now + RoundSpacing;
                Line("round", json =>
                {
                    json.WriteNumber("cycle", done.Id.Cycle);
                    json.WriteNumber("round", done.Id.Round);
                    json.WriteNumber("answered", done.Answered);
                    json.WriteNumber("asked", done.Asked);
                    Measure(json, done.Measure);
                });
                break;
            case CoordinatorNews.CycleDone done:
                Line("cycle", json =>
                {
                    json.WriteNumber("cycle", done.Cycle);
                    json.WriteBoolean("settled", done.End == CycleEnd.Settled);
                    json.WriteString("end", done.End.ToString());
                    json.WriteNumber("rounds", done.Rounds);
                    json.WriteNumber("seconds", done.Seconds);
                    Measure(json, done.Measure);
                });
                break;
            default:
                break;
        }
    }

    public void Dispose() => _buffer.Dispose();

    private void Measure(Utf8JsonWriter json, RoundMeasure measure)
    {
        json.WriteNumber("mismatch_mw", measure.MismatchMw);
        json.WriteNumber("mismatch_limit_mw", Math.Max(_setup.MismatchLimitMw, measure.MismatchFloorMw));
        json.WriteNumber("price_move_per_mwh", measure.PriceMovePerMwh);
        json.WriteNumber("price_move_limit_per_mwh", Math.Max(_setup.PriceMoveLimitPerMwh, measure.PriceFloorPerMwh));
    }

    private void Line(string name, Action<Utf8JsonWriter> body)
    {
        _buffer.SetLength(0);
        using (var json = new Utf8JsonWriter(_buffer))
        {
            json.WriteStartObject();
            json.WriteString("event", name);
            body(json);
            json.WriteEndObject();
        }

        _buffer.WriteByte((byte)'\n');
        _output.Write(_buffer.GetBuffer(), 0, (int)_buffer.Length);
        _output.Flush();
    }
}
