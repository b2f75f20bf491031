# Image of the coordinator. Build it with deploy/images.sh, or, after a native publish, from the repository's top level:
#
#   docker build --file deploy/Coordinator.Dockerfile --tag halfvoice-coordinator:local .
#
# Any Debian 12 like base with glibc, libssl3 and /bin/sh will do: --build-arg BASE=<image>. The shell serves the build
# alone; at run time the container holds one process and needs none. The root file system may be mounted read-only.
#
# Mounts: /bundle (read-only) is the coordinator's folder as `halfvoice pack` made it, readable by the user below; /state
# keeps the journal and must outlive the container, because it is what a restarted coordinator resumes from.
#
# There is no HEALTHCHECK: the port speaks mutual TLS only, so a probe without a certificate would count as a failed
# login in the journal; readiness is the line {"event":"ready",...} on standard output.
ARG BASE=halfvoice-base:bookworm
FROM ${BASE}

LABEL org.opencontainers.image.title="halfvoice-coordinator" \
      org.opencontainers.image.description="Coordinator of a distributed dispatch rehearsal" \
      org.opencontainers.image.licenses="Apache-2.0"

RUN mkdir -m 0700 /state && chown 10001:10001 /state
COPY artifacts/native/publish/Coordinator/release_linux-x64/halfvoice-coordinator \
     artifacts/native/publish/Coordinator/release_linux-x64/libe_sqlite3.so \
     /opt/halfvoice/

USER 10001:10001
VOLUME /state
EXPOSE 7443
ENTRYPOINT ["/opt/halfvoice/halfvoice-coordinator"]
CMD ["--bundle", "/bundle", "--state", "/state", "--listen", "0.0.0.0:7443"]
