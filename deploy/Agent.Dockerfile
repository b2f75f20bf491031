# Image of one site's agent. Build it with deploy/images.sh, or, after a native publish, from the repository's top level:
#
#   docker build --file deploy/Agent.Dockerfile --tag halfvoice-agent:local .
#
# Any Debian 12 like base with glibc, libssl3 and /bin/sh will do: --build-arg BASE=<image>. The shell serves the build
# alone; at run time the container holds one process and needs none. The root file system may be mounted read-only.
#
# Mounts: /bundle (read-only) is the site's folder as `halfvoice pack` made it, readable by the user below; /state keeps
# the privacy ledger and must outlive the container, because a site that forgets what it spent would spend it again.
#
# There is no HEALTHCHECK: an agent listens on no port, ends by itself when it cannot go on, and the coordinator knows
# better than a probe whether its answers arrive.
ARG BASE=halfvoice-base:bookworm
FROM ${BASE}

LABEL org.opencontainers.image.title="halfvoice-agent" \
      org.opencontainers.image.description="One site of a distributed dispatch rehearsal; starts in shadow mode" \
      org.opencontainers.image.licenses="Apache-2.0"

RUN mkdir -m 0700 /state && chown 10001:10001 /state
COPY artifacts/native/publish/Agent/release_linux-x64/halfvoice-agent \
     artifacts/native/publish/Agent/release_linux-x64/libe_sqlite3.so \
     /opt/halfvoice/

USER 10001:10001
VOLUME /state
ENTRYPOINT ["/opt/halfvoice/halfvoice-agent"]
CMD ["--bundle", "/bundle", "--state", "/state"]
